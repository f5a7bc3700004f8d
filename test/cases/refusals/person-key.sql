-- the person's key cannot be shown
-- refused: rows.person
SELECT rider_id, count(*) FROM trips GROUP BY rider_id;
