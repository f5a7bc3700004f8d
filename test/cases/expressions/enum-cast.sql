-- a constant cast to an enum type with a quoted name
SELECT count(*) FROM events WHERE e = 'elated'::"Mood" OR e < 'Sea sick'::public."Mood";
