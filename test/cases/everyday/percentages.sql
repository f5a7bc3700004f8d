-- percentages per group, rounded
SELECT kind, round(100.0 * count(*) FILTER (WHERE delay_min > 15) / count(*), 1) AS late FROM trips GROUP BY kind;
