-- a boolean key
SELECT concession, count(*), avg(birth_year) FROM riders GROUP BY concession;
