-- quoted names throughout, with the schema
SELECT s."Zone", count(s."Ticket No") FROM public."Season Tickets" s GROUP BY s."Zone" ORDER BY s."Zone";
