-- joined on a quoted person column
SELECT count(*), sum(s."Paid") FROM "Season Tickets" AS s JOIN riders AS r ON s."Rider" = r.rider_id WHERE r.district <> 'Northbank';
