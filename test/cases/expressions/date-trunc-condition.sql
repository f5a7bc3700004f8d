-- date_trunc in a condition
SELECT count(*) FROM trips WHERE date_trunc('month', travelled) = date '2025-02-01';
