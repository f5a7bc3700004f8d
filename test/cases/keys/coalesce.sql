-- coalesce of a nullable boolean
SELECT coalesce(newsletter, false) AS news, count(*) FROM riders GROUP BY 1;
