-- a named window over finished groups
-- ordered
SELECT severity, count(*), sum(count(*)) OVER w AS running, lag(count(*)) OVER w FROM complaints GROUP BY severity WINDOW w AS (ORDER BY severity) ORDER BY severity;
