-- a quoted key column
SELECT "Zone", count(*), sum("Paid") AS "Total Paid" FROM "Season Tickets" GROUP BY "Zone";
