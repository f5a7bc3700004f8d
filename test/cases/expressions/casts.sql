-- casts that fit
SELECT sum(fare_pence::bigint), sum(delay_min::int), sum(stars::numeric), avg(fare_pence::float8) FROM trips;
