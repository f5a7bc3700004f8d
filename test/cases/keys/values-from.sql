-- keys from a published table, NULL listed where the column may be NULL
-- differs: empty groups
-- extra: ["6", "0", "0"]
SELECT from_pier, count(*), count(DISTINCT rider_id) FROM trips GROUP BY from_pier;
