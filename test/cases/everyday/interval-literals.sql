-- the last days before a day
SELECT count(*) FROM trips WHERE travelled >= date '2025-06-01' - interval '30 days' AND travelled < date '2025-06-01' - 7;
