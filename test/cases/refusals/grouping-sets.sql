-- several groupings in one
-- refused: block.shape
SELECT kind, count(*) FROM trips GROUP BY ROLLUP (kind);
