-- arithmetic over several aggregates
SELECT (sum(fare_pence) - 7 * count(*)) % 1000, greatest(count(*), sum(stars)), power(avg(stars), 2) FROM trips;
