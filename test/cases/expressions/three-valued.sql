-- AND, OR, NOT over NULLs
SELECT count(*) FILTER (WHERE stars > 0 OR fare_pence > 600), count(*) FILTER (WHERE NOT (stars > 0 AND fare_pence > 600)), count(*) FILTER (WHERE (stars > 0) IS NOT TRUE), count(*) FILTER (WHERE (stars > 0) IS UNKNOWN) FROM trips;
