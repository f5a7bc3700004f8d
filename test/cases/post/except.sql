-- EXCEPT of finished groups
SELECT kind FROM trips GROUP BY kind EXCEPT SELECT kind FROM trips GROUP BY kind HAVING count(*) > 139;
