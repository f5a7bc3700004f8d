-- sum of an expression over clamped columns
SELECT sum(fare_pence * 2 + 1), sum(fare_pence - stars), sum(-fare_pence), sum(abs(stars)) FROM trips;
