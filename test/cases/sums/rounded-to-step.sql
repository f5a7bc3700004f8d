-- values between two steps are rounded to the grid before they are added
-- differs: rounding
SELECT sum(delay_min / 4) AS quarter FROM trips WHERE delay_min < 10;
-- instead
SELECT sum(round(delay_min / 4, 4)) AS quarter FROM trips WHERE delay_min < 10;
