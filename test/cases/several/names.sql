-- columns are called as PostgreSQL calls them
SELECT count(*), sum(stars), avg(stars) AS mean, avg(stars)::int, count(*) > 3, CASE WHEN count(*) > 1 THEN 'many' ELSE 'few' END, coalesce(sum(stars), 0) FROM trips;
