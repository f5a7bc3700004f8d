-- LIKE, ILIKE and their negations
SELECT count(*) FILTER (WHERE note LIKE 'l%'), count(*) FILTER (WHERE note ILIKE 'L_te'), count(*) FILTER (WHERE note NOT LIKE '%,%'), count(*) FILTER (WHERE note NOT ILIKE '%E%') FROM trips;
