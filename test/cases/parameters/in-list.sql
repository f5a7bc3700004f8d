-- parameters in a list and a range
-- parameter: int4 1
-- parameter: int4 4
SELECT from_pier, count(*) FROM trips WHERE from_pier IN ($1, $2) AND stars BETWEEN -$1 AND $2 GROUP BY from_pier HAVING count(*) > $1;
