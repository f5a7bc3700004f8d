-- escaped wildcards
SELECT count(*) FILTER (WHERE nickname LIKE '%\%'), count(*) FILTER (WHERE nickname LIKE 'g\_ll'), count(*) FILTER (WHERE nickname LIKE '_____l') FROM riders;
