-- SELECT INTO a temporary table
SELECT concession, count(*) AS n INTO TEMP per_concession FROM riders GROUP BY concession;
SELECT * FROM per_concession;
