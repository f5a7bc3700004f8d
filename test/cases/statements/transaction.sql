-- a savepoint around a private statement
BEGIN;
SAVEPOINT a;
SELECT count(*) FROM trips;
ROLLBACK TO a;
SELECT count(*) FROM riders;
COMMIT;
