-- comparisons of uuids and enums
SELECT count(*) FILTER (WHERE u = '00000000-0000-4000-8000-000000000003'), count(*) FILTER (WHERE e = 'Sea sick'), count(*) FILTER (WHERE e > 'calm'), count(*) FILTER (WHERE e IN ('calm', 'elated')) FROM events;
