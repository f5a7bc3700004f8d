-- char(n) compares without its padding
SELECT count(*) FILTER (WHERE c = 'c1'), count(*) FILTER (WHERE c = 'c1    '), count(*) FILTER (WHERE v = 'v1'), count(*) FILTER (WHERE length(c) = 2) FROM events;
