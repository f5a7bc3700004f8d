-- a common table of values names the groups
WITH wanted(w) AS (VALUES ('late'), ('wet'), ('dry')) SELECT w, count(t.trip_id) FROM wanted LEFT JOIN trips t ON t.note = w GROUP BY w;
