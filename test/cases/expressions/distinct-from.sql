-- IS DISTINCT FROM treats NULL as a value
SELECT count(*) FILTER (WHERE from_pier IS DISTINCT FROM to_pier), count(*) FILTER (WHERE from_pier IS NOT DISTINCT FROM to_pier), count(*) FILTER (WHERE note IS DISTINCT FROM 'wet') FROM trips;
