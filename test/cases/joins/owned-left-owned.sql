-- riders LEFT JOIN trips on the person counts riders without trips
SELECT count(*), count(t.trip_id), sum(t.fare_pence), count(DISTINCT r.rider_id) FROM riders r LEFT JOIN trips t ON t.rider_id = r.rider_id;
