-- IN and NOT IN with NULLs among rows and list
SELECT count(*) FILTER (WHERE from_pier IN (1, 3, 99)), count(*) FILTER (WHERE from_pier NOT IN (1, 3)), count(*) FILTER (WHERE note IN ('wet', NULL)), count(*) FILTER (WHERE note NOT IN ('wet', NULL)), count(*) FILTER (WHERE from_pier = ANY (ARRAY[2, 4])) FROM trips;
