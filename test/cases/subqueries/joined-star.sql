-- a derived table over a join with stars
SELECT district, count(*) FROM (SELECT r.*, t.fare_pence FROM riders r JOIN trips t USING (rider_id)) AS j WHERE district <> 'Gullhaven' GROUP BY district HAVING count(*) > 0;
