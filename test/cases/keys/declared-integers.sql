-- integers may be declared as values
SELECT severity, count(*), sum(severity) AS total FROM complaints GROUP BY severity;
