-- the ends of smallint and integer are summed without overflow
SELECT sum(i2), sum(i4), count(*) FROM events;
