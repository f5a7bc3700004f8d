-- letters outside ASCII
SELECT count(*) FILTER (WHERE nickname = 'Ærfugl'), count(*) FILTER (WHERE lower(nickname) LIKE 'æ%'), count(*) FILTER (WHERE nickname = '') FROM riders;
