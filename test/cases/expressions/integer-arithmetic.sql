-- integer division, remainder and signs
SELECT sum(fare_pence / 7), sum(fare_pence % 7), sum(stars / 2), sum(stars % 3), sum(fare_pence / (stars + 100)) FROM trips;
