/**
 * One query over pg_catalog alone that describes every relation of the schemas in $1 as JSON text; PostgreSQL 13 to 18.
 * A column counts as NOT NULL only where no unvalidated constraint says so (18 keeps those). A unique index proves its columns only where it is a valid, immediate, non-partial
 * btree over plain columns under the columns' own collations and the types' own equality; INCLUDE columns are none of its key. The clones that a partition keeps of a
 * foreign key to a partitioned table are left out.
 */
export const relationsSql = `
  with recursive relation as (
    select c.oid, c.relname, c.relkind, n.nspname,
           exists (select from pg_catalog.pg_inherits i where i.inhparent = c.oid) as has_children,
           exists (select from pg_catalog.pg_inherits i where i.inhrelid = c.oid) and not c.relispartition as is_child
    from pg_catalog.pg_class c
    join pg_catalog.pg_namespace n on n.oid = c.relnamespace
    where n.nspname = any ($1::pg_catalog.text[]) and c.relkind in ('r', 'p', 'v', 'm', 'f')
  ),
  attribute as (
    select a.attrelid, a.attnum, a.attname, a.atttypid, a.atttypmod, a.attcollation,
           a.attnotnull and not exists (
             select from pg_catalog.pg_constraint k
             where k.conrelid = a.attrelid and k.contype = 'n' and not k.convalidated and a.attnum = any (k.conkey)
           ) as not_null
    from pg_catalog.pg_attribute a
    join relation r on r.oid = a.attrelid
    where a.attnum > 0 and not a.attisdropped
  ),
  unique_key as (
    select x.indrelid, x.indexrelid, x.indisprimary,
           (select pg_catalog.json_agg(a.attname order by k.place)
            from pg_catalog.generate_series(0, x.indnkeyatts - 1) k(place)
            join attribute a on a.attrelid = x.indrelid and a.attnum = x.indkey[k.place]) as columns
    from pg_catalog.pg_index x
    join relation r on r.oid = x.indrelid and r.relkind in ('r', 'p')
    join pg_catalog.pg_class i on i.oid = x.indexrelid
    join pg_catalog.pg_am m on m.oid = i.relam and m.amname = 'btree'
    where x.indisunique and x.indisvalid and x.indisready and x.indimmediate and not x.indisexclusion and x.indpred is null and x.indexprs is null
      and not (r.relkind = 'r' and r.has_children) and not r.is_child
      and not exists (
        select
        from pg_catalog.generate_series(0, x.indnkeyatts - 1) k(place)
        join pg_catalog.pg_opclass o on o.oid = x.indclass[k.place]
        left join attribute a on a.attrelid = x.indrelid and a.attnum = x.indkey[k.place]
        where a.attnum is null or not a.not_null or not o.opcdefault or x.indcollation[k.place] <> a.attcollation
      )
  ),
  reads as (
    select r.oid as reader, r.oid as via from relation r
    union
    select f.reader, d.target
    from reads f
    cross join lateral (
      select p.refobjid as target
      from pg_catalog.pg_rewrite w
      join pg_catalog.pg_class v on v.oid = w.ev_class and v.relkind in ('v', 'm')
      join pg_catalog.pg_depend p on p.classid = 'pg_catalog.pg_rewrite'::pg_catalog.regclass and p.objid = w.oid
      where w.ev_class = f.via and p.refclassid = 'pg_catalog.pg_class'::pg_catalog.regclass and p.refobjid <> f.via
      union all
      select i.inhrelid from pg_catalog.pg_inherits i where i.inhparent = f.via
    ) d
  ),
  calls as (
    select f.reader, n.nspname, p.proname
    from reads f
    join pg_catalog.pg_rewrite w on w.ev_class = f.via
    join pg_catalog.pg_class v on v.oid = w.ev_class and v.relkind in ('v', 'm')
    join pg_catalog.pg_depend d on d.classid = 'pg_catalog.pg_rewrite'::pg_catalog.regclass and d.objid = w.oid and d.refclassid = 'pg_catalog.pg_proc'::pg_catalog.regclass
    join pg_catalog.pg_proc p on p.oid = d.refobjid
    join pg_catalog.pg_namespace n on n.oid = p.pronamespace
  )
  select pg_catalog.json_build_object(
    'schema', r.nspname,
    'name', r.relname,
    'kind', case
      when r.relkind in ('v', 'm') then 'view'
      when r.relkind = 'f' then 'foreign'
      when r.is_child or (r.relkind = 'r' and r.has_children) then 'inherited'
      when r.relkind = 'p' then 'partitioned'
      else 'ordinary' end,
    'columns', coalesce((
      select pg_catalog.json_agg(pg_catalog.json_build_object(
        'name', a.attname,
        'type', pg_catalog.json_build_object(
          'schema', tn.nspname, 'name', t.typname, 'printed', pg_catalog.format_type(a.atttypid, a.atttypmod), 'modifier', a.atttypmod,
          'kind', case when t.typtype = 'e' then 'enum' when t.typtype = 'd' then 'domain' when t.typtype = 'b' and t.typcategory <> 'A' then 'base' else 'other' end,
          'labels', coalesce((select pg_catalog.json_agg(e.enumlabel order by e.enumsortorder) from pg_catalog.pg_enum e where e.enumtypid = t.oid), '[]'::pg_catalog.json)),
        'notNull', a.not_null,
        'collation', (select ln.nspname || '.' || l.collname from pg_catalog.pg_collation l join pg_catalog.pg_namespace ln on ln.oid = l.collnamespace
                       where l.oid = a.attcollation and l.collname <> 'default'),
        'deterministic', coalesce((select l.collisdeterministic from pg_catalog.pg_collation l where l.oid = a.attcollation), true)
      ) order by a.attnum)
      from attribute a
      join pg_catalog.pg_type t on t.oid = a.atttypid
      join pg_catalog.pg_namespace tn on tn.oid = t.typnamespace
      where a.attrelid = r.oid), '[]'::pg_catalog.json),
    'primaryKey', (select u.columns from unique_key u where u.indrelid = r.oid and u.indisprimary),
    'uniqueKeys', coalesce((select pg_catalog.json_agg(u.columns order by not u.indisprimary, u.indexrelid) from unique_key u where u.indrelid = r.oid), '[]'::pg_catalog.json),
    'foreignKeys', coalesce((
      select pg_catalog.json_agg(pg_catalog.json_build_object(
        'columns', (select pg_catalog.json_agg(a.attname order by k.place) from pg_catalog.unnest(f.conkey) with ordinality k(number, place)
                    join pg_catalog.pg_attribute a on a.attrelid = f.conrelid and a.attnum = k.number),
        'schema', fn.nspname, 'table', fc.relname,
        'referenced', (select pg_catalog.json_agg(a.attname order by k.place) from pg_catalog.unnest(f.confkey) with ordinality k(number, place)
                       join pg_catalog.pg_attribute a on a.attrelid = f.confrelid and a.attnum = k.number)
      ) order by f.oid)
      from pg_catalog.pg_constraint f
      join pg_catalog.pg_class fc on fc.oid = f.confrelid
      join pg_catalog.pg_namespace fn on fn.oid = fc.relnamespace
      where f.conrelid = r.oid and f.contype = 'f'
        and not exists (select from pg_catalog.pg_constraint p where p.oid = f.conparentid and p.conrelid = f.conrelid)), '[]'::pg_catalog.json),
    'readsFrom', coalesce((
      select pg_catalog.json_agg(x.name order by x.name collate "C")
      from (select n.nspname || '.' || c.relname as name
            from reads f join pg_catalog.pg_class c on c.oid = f.via join pg_catalog.pg_namespace n on n.oid = c.relnamespace
            where f.reader = r.oid and f.via <> r.oid
            union
            select k.nspname || '.' || k.proname || '()' from calls k where k.reader = r.oid) x), '[]'::pg_catalog.json)
  )::pg_catalog.text
  from relation r
  order by r.nspname collate "C", r.relname collate "C"`

export const serverSql = `
  select (select s.system_identifier from pg_catalog.pg_control_system() s)::pg_catalog.text, pg_catalog.current_setting('server_version_num')`
