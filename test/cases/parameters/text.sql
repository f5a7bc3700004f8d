-- a text parameter
-- parameter: text Eastquay
SELECT count(*) FROM riders WHERE district = $1;
