-- many aggregates over one block
SELECT count(*), count(fare_pence), sum(fare_pence), avg(fare_pence), count(DISTINCT rider_id), sum(delay_min), avg(delay_min), sum(weight_kg) FROM trips;
