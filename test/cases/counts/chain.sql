-- a table that is owned through another is counted like any other
SELECT count(*), count(resolved), count(topic) FROM complaints WHERE severity >= 3;
