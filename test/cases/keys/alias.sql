-- GROUP BY an alias
SELECT stars IS NULL AS silent, count(*) FROM trips GROUP BY silent;
