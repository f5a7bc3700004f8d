-- the years of the clamp
-- differs: empty groups
-- extra: ["2026", "0"]
SELECT extract(year FROM "Valid From"), count(*) FROM "Season Tickets" GROUP BY 1;
