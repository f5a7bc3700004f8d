-- a function that is not in the table of functions
-- refused: expr.function
SELECT count(*) FROM trips WHERE md5(note) = 'x';
