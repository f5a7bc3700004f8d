-- a window over people's rows
-- refused: rows.window
SELECT kind, row_number() OVER (ORDER BY fare_pence) FROM trips;
