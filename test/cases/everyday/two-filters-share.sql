-- several shares of one block
SELECT count(*) FILTER (WHERE kind = 'single') * 100 / count(*) AS single, count(*) FILTER (WHERE kind = 'return') * 100 / count(*) AS back FROM trips;
