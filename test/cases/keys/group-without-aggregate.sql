-- GROUP BY without an aggregate lists the groups, for nothing
-- free
SELECT concession FROM riders GROUP BY concession;
