-- another such column has other empty groups
-- differs: empty groups
-- extra: ["5", "0"]
-- extra: ["6", "0"]
SELECT to_pier, count(*) FROM trips GROUP BY to_pier;
