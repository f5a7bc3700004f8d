-- two published tables cross joined name the groups
SELECT p.name, x.k, count(t.trip_id) FROM piers p CROSS JOIN (VALUES ('single'::trip_kind), ('return')) AS x(k) LEFT JOIN trips t ON t.from_pier = p.pier_id AND t.kind = x.k GROUP BY p.name, x.k;
