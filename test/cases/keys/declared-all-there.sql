-- declared values that all occur differ in nothing
SELECT kind, count(*), sum(fare_pence) AS pence FROM trips GROUP BY kind;
