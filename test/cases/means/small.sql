-- a mean below one has more digits
SELECT avg(stars) FILTER (WHERE stars BETWEEN 0 AND 1), avg(severity) FROM trips JOIN complaints USING (trip_id);
