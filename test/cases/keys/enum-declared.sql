-- an enum with a quoted name
SELECT e, count(*) FROM events GROUP BY e;
