-- a month's table joined by a range
SELECT m.label, count(t.trip_id), count(DISTINCT t.rider_id) FROM months m LEFT JOIN trips t ON t.boarded_at >= m.month AND t.boarded_at < m.next GROUP BY m.label;
