-- numeric arithmetic is exact
SELECT sum(delay_min * 2), sum(delay_min + 0.1), sum(delay_min - 100) FROM trips;
