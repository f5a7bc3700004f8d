-- PREPARE and EXECUTE with different values
PREPARE by_pier(int) AS SELECT count(*), sum(fare_pence) FROM trips WHERE from_pier = $1;
EXECUTE by_pier(1);
EXECUTE by_pier(3);
EXECUTE by_pier(1);
DEALLOCATE by_pier;
