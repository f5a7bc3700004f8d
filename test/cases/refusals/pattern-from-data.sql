-- a pattern that comes from the rows
-- refused: expr.unsupported
SELECT count(*) FROM trips WHERE note LIKE note || '%';
