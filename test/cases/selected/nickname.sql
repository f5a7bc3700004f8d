-- a varchar key keeps its type
-- differs: single-person groups
SELECT nickname, count(*) FROM riders GROUP BY nickname;
-- instead
SELECT nickname, count(*) FROM riders GROUP BY nickname HAVING count(*) > 1;
