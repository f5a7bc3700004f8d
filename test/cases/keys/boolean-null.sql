-- a nullable boolean has three groups
SELECT newsletter, count(*) FROM riders GROUP BY newsletter;
