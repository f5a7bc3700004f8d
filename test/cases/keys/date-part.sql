-- date_part gives double precision
-- differs: empty groups
-- extra: ["7", "0"]
-- extra: ["8", "0"]
-- extra: ["9", "0"]
-- extra: ["10", "0"]
-- extra: ["11", "0"]
-- extra: ["12", "0"]
SELECT date_part('month', travelled) AS m, count(*) FROM trips GROUP BY m;
