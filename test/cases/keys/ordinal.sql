-- GROUP BY position
SELECT concession, newsletter, count(*) FROM riders GROUP BY 2, 1;
