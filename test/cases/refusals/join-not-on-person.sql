-- a join that sets one person's rows against another's
-- refused: join.person
SELECT count(*) FROM trips a JOIN trips b ON a.from_pier = b.from_pier;
