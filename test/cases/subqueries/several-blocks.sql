-- several blocks in one statement
WITH a AS (SELECT count(*) AS n FROM trips), b AS (SELECT count(*) AS n FROM riders), c AS (SELECT count(*) AS n FROM complaints) SELECT a.n, b.n, c.n, a.n::float8 / b.n AS each FROM a, b, c;
