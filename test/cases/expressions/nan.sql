-- NaN and infinities in comparisons
SELECT count(*) FILTER (WHERE d > 1000), count(*) FILTER (WHERE d = 'NaN'), count(*) FILTER (WHERE n = 'NaN'), count(*) FILTER (WHERE r < '-1000'), count(*) FILTER (WHERE d = 'Infinity'), count(d), count(n) FROM events;
