-- WHERE false with GROUP BY is no row
-- free
SELECT kind, note, count(*) FROM trips WHERE false GROUP BY kind, note;
