-- count(*) would count piers without trips
-- refused: join.padding
SELECT p.name, count(*) FROM piers p LEFT JOIN trips t ON t.from_pier = p.pier_id GROUP BY p.name;
