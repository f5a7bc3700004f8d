-- a condition in ON of the LEFT JOIN
SELECT count(*), count(t.stars) FROM riders r LEFT JOIN trips t ON t.rider_id = r.rider_id AND t.kind = 'season' AND t.stars > 0;
