-- shares by a window over finished groups
SELECT kind, count(*), round(100.0 * count(*) / sum(count(*)) OVER (), 1) AS share, rank() OVER (ORDER BY count(*) DESC) FROM trips GROUP BY kind;
