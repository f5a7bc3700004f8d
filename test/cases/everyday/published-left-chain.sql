-- a list joined to a table that is owned through another
SELECT v.topic, count(c.complaint_id) FROM (VALUES ('noise'), ('crew'), ('ghosts')) AS v(topic) LEFT JOIN complaints c ON c.topic = v.topic GROUP BY v.topic;
