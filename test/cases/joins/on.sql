-- JOIN ON the person
SELECT count(*), sum(t.fare_pence) FROM trips t JOIN riders r ON r.rider_id = t.rider_id WHERE r.concession;
