-- nullif makes NULLs
SELECT sum(nullif(stars, 3)), count(nullif(note, 'wet')), count(nullif(kind, 'single')) FROM trips;
