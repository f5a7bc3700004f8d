-- a column of a joined published table
-- differs: empty groups
-- extra: ["Nowhere Jetty", "0", "0"]
SELECT p.name, count(*), sum(t.stars) FROM trips t JOIN piers p ON p.pier_id = t.from_pier GROUP BY p.name;
