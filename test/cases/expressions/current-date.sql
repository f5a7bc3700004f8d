-- current_date minus days
SELECT count(*), count(*) FILTER (WHERE joined > current_date - 100000) FROM riders WHERE last_seen < current_date + 2;
