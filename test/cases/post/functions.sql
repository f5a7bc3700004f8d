-- any function over finished values
SELECT upper(kind::text), to_char(count(*), 'FM9999.00'), format('%s of %s', kind, sum(stars)), jsonb_build_object('n', count(*)) FROM trips GROUP BY kind;
