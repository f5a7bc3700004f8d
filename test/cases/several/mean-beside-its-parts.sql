-- a mean brings its count and sum along, and they agree
SELECT sum(stars), count(stars), avg(stars), sum(stars)::numeric / count(stars) FROM trips;
