-- a setting that cannot be read
-- refused: setting.bad
SELECT set_config('hedgerow.noise', 'loud', false), (SELECT count(*) FROM trips);
