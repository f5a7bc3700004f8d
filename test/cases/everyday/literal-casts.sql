-- literals with types
SELECT count(*) FROM trips WHERE travelled >= '2025-02-01'::date AND travelled < CAST('2025-03-01' AS date) AND fare_pence >= '100' AND kind = 'single'::trip_kind;
