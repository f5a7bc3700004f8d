-- a column of FROM comes before an alias of the list
SELECT count(*) AS concession FROM riders GROUP BY concession;
