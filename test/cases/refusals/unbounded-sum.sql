-- a sum without a declared range
-- refused: expr.clamp
SELECT sum(length(note)) FROM trips;
