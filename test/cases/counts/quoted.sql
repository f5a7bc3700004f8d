-- quoted mixed-case names and a column called like a key word
SELECT count(*), count("Paid"), count("select") AS "How Many" FROM "Season Tickets" WHERE "Zone" = 2 AND "select" = 'c''d';
