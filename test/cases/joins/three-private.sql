-- three owned tables on the person
SELECT count(*), count(DISTINCT r.rider_id) FROM riders r JOIN trips t USING (rider_id) JOIN "Season Tickets" s ON s."Rider" = r.rider_id WHERE t.kind = 'season';
