-- generate_series of integers
SELECT s, count(c.complaint_id) FROM generate_series(0, 7) AS s LEFT JOIN complaints c ON c.severity = s GROUP BY s;
