-- comparisons of dates, infinite ones too
SELECT count(*) FILTER (WHERE dt > '2025-02-01'), count(*) FILTER (WHERE dt = 'infinity'), count(*) FILTER (WHERE ts < '2025-02-10'), count(*) FILTER (WHERE tz >= timestamptz '2025-03-05 00:00+00'), count(*) FILTER (WHERE tm > '12:00'), count(dt) FROM events;
