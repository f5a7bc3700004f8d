-- INSERT INTO a temporary table
CREATE TEMP TABLE notes (what text, n bigint, mean numeric);
INSERT INTO notes SELECT 'trips', count(*), avg(stars) FROM trips;
INSERT INTO notes (n) SELECT count(*) FROM riders;
SELECT * FROM notes;
