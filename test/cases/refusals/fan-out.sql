-- a join that multiplies without bound
-- refused: join.fan-out
SELECT count(*) FROM trips a, trips b, trips c, trips d, trips e, trips f, trips g, trips h WHERE g.rider_id = a.rider_id AND h.rider_id = a.rider_id AND a.rider_id = b.rider_id AND b.rider_id = c.rider_id AND c.rider_id = d.rider_id AND d.rider_id = e.rider_id AND e.rider_id = f.rider_id;
