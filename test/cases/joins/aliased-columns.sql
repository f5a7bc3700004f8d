-- an alias that renames columns
SELECT count(*), sum(f) FROM trips AS t(id, who, at, day, a, b, f) JOIN riders AS r(rid) ON r.rid = t.who WHERE t.a = 1;
