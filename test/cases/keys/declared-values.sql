-- declared values are all shown, the empty one too
-- differs: empty groups
-- extra: ["Gullhaven", "0", "0", null]
SELECT district, count(*), sum(birth_year), avg(birth_year) FROM riders GROUP BY district;
