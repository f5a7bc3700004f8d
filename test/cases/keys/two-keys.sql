-- two keys, every combination
-- differs: empty groups
-- extra: ["Gullhaven", "f", "0"]
-- extra: ["Gullhaven", "t", "0"]
SELECT district, concession, count(*) FROM riders GROUP BY district, concession;
