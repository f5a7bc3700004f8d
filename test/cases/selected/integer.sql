-- an undeclared integer key, NULL among them
-- differs: single-person groups
SELECT birth_year, count(*) FROM riders GROUP BY birth_year;
-- instead
SELECT birth_year, count(*) FROM riders GROUP BY birth_year HAVING count(*) > 1;
