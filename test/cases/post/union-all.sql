-- UNION ALL of blocks
SELECT 'trips' AS what, count(*) FROM trips UNION ALL SELECT 'riders', count(*) FROM riders UNION ALL SELECT 'piers', count(*) FROM piers;
