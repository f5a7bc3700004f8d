-- rows of people are not shown
-- refused: rows.private
SELECT * FROM trips;
