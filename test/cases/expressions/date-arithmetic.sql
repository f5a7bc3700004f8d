-- dates plus days and minus dates
SELECT count(*) FILTER (WHERE travelled + 30 > '2025-05-01'), count(*) FILTER (WHERE travelled - date '2025-01-01' > 50), sum(travelled - date '2025-01-01') FROM trips;
