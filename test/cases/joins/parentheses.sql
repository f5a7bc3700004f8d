-- joins in parentheses, an alias over one
SELECT count(*), sum(j.fare_pence) FROM ((trips t JOIN piers p ON p.pier_id = t.from_pier) JOIN riders r ON (r.rider_id = t.rider_id)) AS j WHERE j.roofed;
