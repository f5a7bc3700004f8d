-- CASE without ELSE has a NULL group
SELECT CASE kind WHEN 'single' THEN 1 WHEN 'return' THEN 2 END AS legs, count(*) FROM trips GROUP BY legs;
