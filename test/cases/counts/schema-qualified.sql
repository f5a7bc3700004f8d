-- a table may be written with its schema
SELECT count(*) AS n FROM public.riders;
