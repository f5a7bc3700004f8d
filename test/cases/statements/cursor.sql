-- a cursor over finished groups
BEGIN;
DECLARE c CURSOR FOR SELECT severity, count(*) FROM complaints GROUP BY severity ORDER BY severity;
FETCH 2 FROM c;
FETCH ALL FROM c;
COMMIT;
