-- division by a column that cannot be 0
SELECT sum(severity * 100 / (severity + 1)) FROM complaints;
