-- boolean conditions written out
SELECT count(*) FILTER (WHERE concession = true), count(*) FILTER (WHERE newsletter IS TRUE), count(*) FILTER (WHERE concession AND newsletter IS NULL) FROM riders;
