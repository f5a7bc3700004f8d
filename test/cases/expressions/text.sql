-- text functions in conditions
SELECT count(*) FILTER (WHERE lower(note) = 'late'), count(*) FILTER (WHERE length(note) > 4), count(*) FILTER (WHERE left(note, 1) = 'w'), count(*) FILTER (WHERE substr(note, 2, 2) = 'og'), count(*) FILTER (WHERE note || '!' = 'wet!'), count(*) FILTER (WHERE btrim(note) = 'windy') FROM trips;
