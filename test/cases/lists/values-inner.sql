-- VALUES joined by an inner join
-- differs: empty groups
-- extra: ["snow", "0"]
SELECT v.w, count(*) FROM (VALUES ('wet'), ('late'), ('snow')) AS v(w) JOIN trips t ON t.note = v.w GROUP BY v.w;
