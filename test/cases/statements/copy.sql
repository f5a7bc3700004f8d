-- COPY of a query to the client
COPY (SELECT kind, count(*), avg(stars) FROM trips GROUP BY kind ORDER BY kind) TO STDOUT WITH (FORMAT csv, HEADER);
