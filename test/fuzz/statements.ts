import { Expressions, familyOf, type Seen } from './expressions.ts'
import type { Random } from './random.ts'
import { tablesOf, type World } from './worlds.ts'

/** A statement in parts, so that it can be shrunk. */
export interface FuzzStatement {
  /** The kind of FROM it has. */
  readonly shape: string
  readonly before: string
  readonly from: string
  readonly keys: readonly string[]
  readonly totals: readonly string[]
  readonly where: readonly string[]
}

export function sqlOf(statement: FuzzStatement): string {
  const { before, from, keys, totals, where } = statement
  const tests = where.length === 0 ? '' : ` WHERE ${where.join(' AND ')}`
  const group = keys.length === 0 ? '' : ` GROUP BY ${keys.map((_, i) => (i + 1).toString()).join(', ')}`
  return `${before}SELECT ${[...keys, ...totals].join(', ')} FROM ${from}${tests}${group}`
}

interface From {
  readonly shape: string
  readonly before?: string
  readonly sql: string
  readonly columns: readonly Seen[]
  /** A column that is the person, where one is in sight. */
  readonly person: string | null
}

/** Writes aggregate statements in every shape of FROM that the planner knows. */
export function statementOf(world: World, random: Random): FuzzStatement {
  const from = fromOf(world, random)
  const expressions = new Expressions(from.columns, random)
  const filter = (): string => (random.chance(0.3) ? ` FILTER (WHERE ${expressions.bool(1)})` : '')
  const owned = (): string => expressions.column((each) => !['piers', 'zones', 'marks', 'lists'].includes(each.kind)) ?? '1'
  const total = (): string => {
    switch (random.below(8)) {
      case 0:
      case 1:
        return `count(*)${filter()}`
      case 2:
        return `count(${owned()})${filter()}`
      case 3:
        return from.person === null ? `count(*)${filter()}` : `count(DISTINCT ${from.person})${filter()}`
      case 4:
        return `count(${random.pick(['1', expressions.number(1), expressions.text(1)])})${filter()}`
      case 5:
      case 6:
        return `sum(${expressions.number(random.below(3))})${filter()}`
      default:
        return `${random.pick(['avg', 'avg', 'avg', 'variance', 'stddev_pop'])}(${expressions.number(random.below(3))})${filter()}`
    }
  }
  return {
    shape: from.shape,
    before: from.before ?? '',
    from: from.sql,
    keys: Array.from({ length: random.pick([0, 1, 1, 1, 2, 2, 3]) }, () => expressions.key()),
    totals: Array.from({ length: 1 + random.below(3) }, total),
    where: Array.from({ length: random.pick([0, 0, 1, 1, 2]) }, () => expressions.bool(1 + random.below(2))),
  }
}

function fromOf(world: World, random: Random): From {
  const tables = tablesOf(world)
  const see = (table: string, alias: string): readonly Seen[] =>
    (tables.find((each) => each.name === table)?.columns ?? []).map((each) => ({ ...each, sql: `${alias}.${each.name}` }))
  const list = (sql: string, kind: Seen['kind']): Seen => ({ sql, kind, name: sql, nullable: true, clamped: false })
  const only = (table: string, alias: string, person: string | null): From => ({ shape: table, sql: `${table} ${alias}`, columns: see(table, alias), person })
  const bool = (...columns: readonly (readonly Seen[])[]): string => new Expressions(columns.flat(), random).bool(1)
  const [t, u, r, l, p, c, y, pier, zone, mark] = [
    see('trips', 't'),
    see('trips', 'u'),
    see('riders', 'r'),
    see('legs', 'l'),
    see('passes', 'p'),
    see('complaints', 'c'),
    see('replies', 'y'),
    see('piers', 'q'),
    see('zones', 'z'),
    see('marks', 'm'),
  ]
  const left = random.pick(['JOIN', 'JOIN', 'LEFT JOIN', 'INNER JOIN'])
  const both = (a: string, b: string): string => (random.chance(0.5) ? `${a} = ${b}` : `${b} = ${a}`)
  const more = (...columns: readonly (readonly Seen[])[]): string => (random.chance(0.4) ? ` AND ${bool(...columns)}` : '')
  const numbered = (columns: readonly Seen[]): string =>
    random.pick(columns.filter((each) => ['integer', 'numeric', 'float'].includes(familyOf(each.kind)))).sql
  const shapes: readonly (() => From)[] = [
    () => only('trips', 't', 't.rider_id'),
    () => only('riders', 'r', 'r.rider_id'),
    () => random.pick([only('legs', 'l', 'l.rider_id'), only('passes', 'p', 'p.rider_id')]),
    () => only('complaints', 'c', null),
    () => only('replies', 'y', null),
    () => ({
      shape: 'trips × riders',
      sql: `trips t ${left} riders r ON ${both('t.rider_id', 'r.rider_id')}${more(t, r)}`,
      columns: [...t, ...r],
      person: 't.rider_id',
    }),
    () => ({
      shape: 'trips USING riders',
      sql: `trips t ${random.pick(['JOIN', 'LEFT JOIN', 'RIGHT JOIN'])} riders r USING (rider_id)`,
      columns: [...t, ...r],
      person: 'rider_id',
    }),
    () => ({
      shape: 'passes NATURAL',
      sql: `riders r NATURAL ${random.pick(['JOIN', 'LEFT JOIN', 'RIGHT JOIN'])} passes p`,
      columns: [...r, ...p],
      person: 'rider_id',
    }),
    () => ({ shape: 'riders LEFT trips', sql: `riders r LEFT JOIN trips t ON r.rider_id = t.rider_id${more(t)}`, columns: [...r, ...t], person: 'r.rider_id' }),
    () => ({
      shape: 'riders RIGHT trips',
      sql: `riders r RIGHT JOIN trips t ON ${both('r.rider_id', 't.rider_id')}${more(t)}`,
      columns: [...r, ...t],
      person: 't.rider_id',
    }),
    () => ({
      shape: 'piers LEFT trips',
      sql: `piers q LEFT JOIN trips t ON t.from_pier = q.pier_id${more(t, pier)}`,
      columns: [...t, ...pier.slice(0, 3)],
      person: 't.rider_id',
    }),
    () => ({
      shape: 'trips LEFT piers',
      sql: `trips t ${left} piers q ON q.pier_id = t.from_pier${more(t, pier)}`,
      columns: [...t, ...pier],
      person: 't.rider_id',
    }),
    () => ({ shape: 'trips × zones', sql: `trips t ${left} zones z ON ${bool(t, zone)}`, columns: [...t, ...zone], person: 't.rider_id' }),
    () => ({
      shape: 'trips × marks',
      sql: `trips t ${left} marks m ON m.${random.pick(['key', 'key', 'moment'])} = ${random.chance(0.5) ? numbered(t) : random.pick(['t.depth', 't.left_at', 't.seen_at', 't.any_day', 't.big'])}`,
      columns: [...t, ...mark],
      person: 't.rider_id',
    }),
    () => ({
      shape: 'series LEFT trips',
      sql: `generate_series(${random.pick(['0, 5', '1, 9, 2', '5, 0, -1', '0, 3'])}) g LEFT JOIN trips t ON ${random.pick(['t.fee', 't.small', 't.fare'])} = g`,
      columns: [...t, list('g', 'int4')],
      person: 't.rider_id',
    }),
    () => ({
      shape: 'months LEFT trips',
      sql: `generate_series('2025-01-01'::timestamp, '2025-12-01', '1 month') g(month) LEFT JOIN trips t ON date_trunc('month', t.left_at) = g.month`,
      columns: [...t, list('g.month', 'timestamp')],
      person: 't.rider_id',
    }),
    () => ({
      shape: 'trips × series',
      sql: `trips t CROSS JOIN generate_series(1, ${random.pick(['2', '5', '40'])}) g`,
      columns: [...t, list('g', 'int4')],
      person: 't.rider_id',
    }),
    () => {
      const values = random.pick([
        `(VALUES (0, 'a'), (1, 'b'), (5, 'c')) v(k, x)`,
        `(VALUES (1.0, 'a'), (1, 'b'), (2.5, 'c')) v(k, x)`,
        `(VALUES ('1'::float8, 'a'), ('1e0', 'b')) v(k, x)`,
        `(VALUES (NULL, 'a'), (1, 'b')) v(k, x)`,
      ])
      return {
        shape: 'VALUES × trips',
        sql: `${values} ${random.pick(['JOIN', 'LEFT JOIN'])} trips t ON ${numbered(t)} = v.k`,
        columns: [...t, list('v.k', 'numeric'), list('v.x', 'text')],
        person: 't.rider_id',
      }
    },
    () => ({ shape: 'self', sql: `trips t ${left} trips u ON t.rider_id = u.rider_id${more(t, u)}`, columns: [...t, ...u], person: 't.rider_id' }),
    () => ({ shape: 'self by key', sql: `trips t ${left} trips u ON t.trip_id = u.trip_id`, columns: [...t, ...u], person: 't.rider_id' }),
    () => ({
      shape: 'self × series',
      sql: `trips t JOIN trips u USING (rider_id) CROSS JOIN generate_series(1, 3) g`,
      columns: [...t, ...u],
      person: 't.rider_id',
    }),
    () => ({ shape: 'trips × legs', sql: `trips t ${left} legs l ON t.rider_id = l.rider_id${more(t, l)}`, columns: [...t, ...l], person: 't.rider_id' }),
    () => ({
      shape: 'legs by key',
      sql: `legs l ${left} legs t ON l.rider_id = t.rider_id AND l.seq = t.seq`,
      columns: [...l, ...see('legs', 't')],
      person: 'l.rider_id',
    }),
    () => ({ shape: 'complaints × trips', sql: `complaints c ${left} trips t ON c.trip_id = t.trip_id`, columns: [...c, ...t], person: 't.rider_id' }),
    () => ({
      shape: 'trips LEFT complaints',
      sql: `trips t LEFT JOIN complaints c ON c.trip_id = t.trip_id${more(c, t)}`,
      columns: [...t, ...c],
      person: 't.rider_id',
    }),
    () => ({ shape: 'replies × complaints', sql: `replies y ${left} complaints c ON y.complaint_id = c.complaint_id`, columns: [...y, ...c], person: null }),
    () => ({
      shape: 'three',
      sql: `trips t JOIN riders r ON r.rider_id = t.rider_id ${left} passes p ON p.rider_id = r.rider_id${more(t, p)}`,
      columns: [...t, ...r, ...p],
      person: 'r.rider_id',
    }),
    () => ({ shape: 'comma', sql: `trips t, riders r, piers q`, columns: [...t, ...r, ...pier], person: 'r.rider_id' }),
    () => ({ shape: 'through a list', sql: throughList(world, random), columns: [...r, ...t], person: 'r.rider_id' }),
    () => {
      const inner = new Expressions(t, random)
      const kinds: readonly Seen[] = [
        list('d.n', 'int4'),
        { ...list('d.d', 'date'), clamped: true },
        list('d.x', 'text'),
        list('d.k', 'text'),
        { ...list('d.f', 'int4'), clamped: true },
      ]
      const query = `SELECT ${inner.number(2)} AS n, t.day AS d, ${inner.text(2)} AS x, ${inner.key()} AS k, t.fee AS f, t.rider_id AS who FROM trips t WHERE ${inner.bool(1)}`
      return random.chance(0.5)
        ? { shape: 'derived', sql: `(${query}) d`, columns: kinds, person: 'd.who' }
        : { shape: 'common table', before: `WITH d AS (${query}) `, sql: `d`, columns: kinds, person: 'd.who' }
    },
    () => ({ shape: 'shadowing', before: `WITH trips AS (SELECT * FROM trips t WHERE ${bool(t)}) `, sql: `trips t`, columns: t, person: 't.rider_id' }),
    () => ({
      shape: 'padded twice',
      sql: `piers q LEFT JOIN (trips t LEFT JOIN riders r ON t.rider_id = r.rider_id${more(t)}) ON q.pier_id = t.from_pier`,
      columns: [...t, ...r, ...pier.slice(0, 2)],
      person: 't.rider_id',
    }),
    () => ({
      shape: 'left of left',
      sql: `riders r LEFT JOIN passes p ON p.rider_id = r.rider_id${more(r, p)} LEFT JOIN legs l ON l.rider_id = r.rider_id${more(p, l)}`,
      columns: [...r, ...p, ...l],
      person: 'r.rider_id',
    }),
  ]
  const made = random.pick(shapes)()
  return made.shape === 'comma'
    ? { ...made, sql: `trips t JOIN (riders r CROSS JOIN piers q) ON ${both('t.rider_id', 'r.rider_id')} AND ${both('q.pier_id', 't.from_pier')}` }
    : made
}

/** Two private tables that meet in a list of the statement's own, in a type that may confuse persons. */
function throughList(world: World, random: Random): string {
  const lists: Readonly<Record<string, string>> = {
    int4: `(VALUES (16777216::float4), (1), (2)) v(k)`,
    int8: `(VALUES (9007199254740992::float8), (1), (2)) v(k)`,
    numeric: `(VALUES (9007199254740992::float8), (123456789012345678.5::float8), (1)) v(k)`,
    varchar: `(VALUES ('x'::bpchar), ('fog'), ('a')) v(k)`,
    text: `(VALUES ('a'::bpchar), (' ')) v(k)`,
    uuid: `(VALUES ('00000000-0000-4000-8000-000000000010'::uuid)) v(k)`,
  }
  return `riders r JOIN ${lists[world.person] ?? '(VALUES (1)) v(k)'} ON r.rider_id = v.k JOIN trips t ON ${random.pick(['t.rider_id = v.k', 'v.k = t.rider_id'])}`
}
