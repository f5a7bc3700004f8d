-- count of an expression leaves out the rows where it is NULL
SELECT count(nullif(kind, 'single')), count(CASE WHEN stars > 2 THEN 1 END), count(newest) FROM (SELECT kind, stars, CASE WHEN travelled > date '2025-03-01' THEN true END AS newest FROM trips) AS t;
