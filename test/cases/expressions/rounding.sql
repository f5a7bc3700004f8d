-- floor, ceil, round, trunc, sign
SELECT sum(floor(delay_min)), sum(ceil(delay_min)), sum(round(delay_min)), sum(trunc(delay_min)), sum(sign(delay_min - 40)), sum(round(delay_min, 1)) FROM trips;
