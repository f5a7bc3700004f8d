-- DISTINCT ON over finished groups
-- ordered
SELECT DISTINCT ON (concession) concession, newsletter, count(*) FROM riders GROUP BY concession, newsletter ORDER BY concession, newsletter NULLS LAST;
