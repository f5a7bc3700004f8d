-- a boolean column as condition, IS TRUE and IS NOT FALSE
SELECT count(*) FILTER (WHERE newsletter), count(*) FILTER (WHERE NOT newsletter), count(*) FILTER (WHERE newsletter IS NOT FALSE), count(*) FILTER (WHERE newsletter = concession) FROM riders;
