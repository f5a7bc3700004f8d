-- a derived table that filters and projects rows
SELECT count(*), sum(pence) FROM (SELECT fare_pence AS pence, kind FROM trips WHERE stars IS NOT NULL) AS t WHERE kind = 'return';
