-- sum and mean of a quoted numeric column
SELECT sum("Paid"), avg("Paid") FROM "Season Tickets";
