-- count(x) leaves NULLs out
SELECT count(fare_pence), count(delay_min), count(to_pier), count(note), count(*) FROM trips;
