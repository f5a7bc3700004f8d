-- NOT, OR and parentheses
SELECT count(*) FROM trips WHERE NOT (from_pier IN (1, 2) OR to_pier = 3) AND (stars >= 0 OR stars IS NULL);
