-- the quoted table's columns and types
-- free
SELECT * FROM "Season Tickets" LIMIT 0;
