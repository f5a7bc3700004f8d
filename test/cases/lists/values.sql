-- VALUES names the groups
SELECT v.kind, v.label, count(t.trip_id) FROM (VALUES ('wet', 'Rain'), ('late', 'Late'), ('snow', 'Snow')) AS v(kind, label) LEFT JOIN trips t ON t.note = v.kind GROUP BY v.kind, v.label;
