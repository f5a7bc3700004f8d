-- a published table joined by a comparison
SELECT count(*) FROM trips t JOIN piers p ON p.opened < t.travelled AND p.zone = 3;
