-- a block inside VALUES
VALUES ((SELECT count(*) FROM trips), 'trips'), ((SELECT count(*) FROM riders), 'riders');
