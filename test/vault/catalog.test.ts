import pg from 'pg'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import type { Catalog, CatalogTable } from '../../src/catalog/catalog.ts'
import { ferryConstraints, ferryTables } from '../../src/demo/schema.ts'
import { readCatalog } from '../../src/vault/catalog.ts'
import { testServer } from '../harness/server.ts'
import type { TestServer } from '../harness/server.ts'

let server: TestServer
let client: pg.Client
let catalog: Catalog

const shape = `
CREATE SCHEMA deck;
CREATE TYPE deck.weather AS ENUM ('fog', 'calm', 'gale');
CREATE DOMAIN deck.pence AS integer CHECK (VALUE >= 0);
CREATE COLLATION deck.caseless (provider = icu, locale = 'und-u-ks-level2', deterministic = false);
CREATE TABLE deck.proved (a integer NOT NULL UNIQUE, b integer NOT NULL, c integer NOT NULL, UNIQUE (b, c), UNIQUE (c) INCLUDE (a));
CREATE TABLE deck.unproved (
  partial integer NOT NULL, deferred integer NOT NULL UNIQUE DEFERRABLE, nullable integer UNIQUE, expression text NOT NULL,
  caseless text COLLATE deck.caseless NOT NULL, opclass text NOT NULL);
CREATE UNIQUE INDEX ON deck.unproved (partial) WHERE partial > 0;
CREATE UNIQUE INDEX ON deck.unproved (lower(expression));
CREATE UNIQUE INDEX ON deck.unproved (caseless COLLATE "C");
CREATE UNIQUE INDEX ON deck.unproved (opclass text_pattern_ops);
CREATE TABLE deck.parent (id integer PRIMARY KEY);
CREATE TABLE deck.child (extra integer) INHERITS (deck.parent);
ALTER TABLE deck.child ADD PRIMARY KEY (id);
CREATE TABLE deck.divided (id integer NOT NULL, PRIMARY KEY (id)) PARTITION BY RANGE (id);
CREATE TABLE deck.divided_low PARTITION OF deck.divided FOR VALUES FROM (0) TO (10);
CREATE TABLE deck.refers (divided_id integer REFERENCES deck.divided, b integer, c integer, FOREIGN KEY (c, b) REFERENCES deck.proved (c, b));
CREATE VIEW deck.first_view AS SELECT a FROM deck.proved;
CREATE VIEW deck.second_view AS SELECT v.a, r.rider_id FROM deck.first_view v CROSS JOIN public.riders r;
CREATE MATERIALIZED VIEW deck.third_view AS SELECT a FROM deck.second_view;
CREATE FUNCTION deck.peek() RETURNS SETOF integer LANGUAGE sql AS 'SELECT rider_id FROM public.riders';
CREATE VIEW deck.calling_view AS SELECT peek FROM deck.peek();
CREATE TABLE deck.typed (
  dropped integer, fare numeric(10,2), sky deck.weather, price deck.pence, tags text[], note varchar(20), caseless text COLLATE deck.caseless, "Odd ""name"" é" text, gone integer);
ALTER TABLE deck.typed DROP COLUMN dropped;
CREATE SEQUENCE deck.counter;
`

beforeAll(async () => {
  server = await testServer()
  client = new pg.Client({ connectionString: await server.createDatabase('catalog') })
  await client.connect()
  await client.query(ferryTables)
  for (const constraint of ferryConstraints) await client.query(constraint)
  await client.query(shape)
  catalog = await readCatalog(client, ['public', 'deck'])
})

afterAll(async () => {
  await client.end()
  await server.stop()
})

function table(name: string): CatalogTable {
  const found = catalog.tables.find((each) => `${each.schema}.${each.name}` === name)
  if (found === undefined) throw new Error(`no table ${name}`)
  return found
}

describe('the catalogue reader', () => {
  test('reads tables, types, keys and foreign keys of the ferries', () => {
    expect(table('public.trips')).toMatchObject({
      kind: 'ordinary',
      primaryKey: ['trip_id'],
      uniqueKeys: [['trip_id']],
      readsFrom: [],
      foreignKeys: expect.arrayContaining([{ columns: ['rider_id'], schema: 'public', table: 'riders', referenced: ['rider_id'] }]),
    })
    expect(table('public.trips').columns.map((column) => [column.name, column.type.printed, column.notNull])).toContainEqual([
      'delay_min',
      'numeric(5,1)',
      false,
    ])
    expect(catalog.systemIdentifier).toMatch(/^\d{15,20}$/)
    expect(catalog.serverVersion).toBeGreaterThanOrEqual(130000)
  })

  test('takes plain unique indexes and constraints as proof, without their included columns', () => {
    expect(table('deck.proved').uniqueKeys).toEqual([['a'], ['b', 'c'], ['c']])
    expect(table('deck.proved').primaryKey).toBe(null)
  })

  test('takes no partial, deferrable, nullable or expression index as proof, and none under another collation or operator class', () => {
    expect(table('deck.unproved').uniqueKeys).toEqual([])
  })

  test('takes a table with inheritance children, and the children, as proof of nothing', () => {
    expect(table('deck.parent')).toMatchObject({ kind: 'inherited', uniqueKeys: [], primaryKey: null, readsFrom: ['deck.child'] })
    expect(table('deck.child')).toMatchObject({ kind: 'inherited', uniqueKeys: [] })
  })

  test('takes a partitioned table as proof, and sees each foreign key to it once', () => {
    expect(table('deck.divided')).toMatchObject({ kind: 'partitioned', uniqueKeys: [['id']], readsFrom: ['deck.divided_low'] })
    expect(table('deck.divided_low')).toMatchObject({ kind: 'ordinary', uniqueKeys: [['id']] })
    expect(table('deck.refers').foreignKeys).toEqual([
      { columns: ['divided_id'], schema: 'deck', table: 'divided', referenced: ['id'] },
      { columns: ['c', 'b'], schema: 'deck', table: 'proved', referenced: ['c', 'b'] },
    ])
  })

  test('follows views and materialized views to the tables they read, at any depth, and names the functions they call', () => {
    expect(table('deck.second_view')).toMatchObject({ kind: 'view', readsFrom: ['deck.first_view', 'deck.proved', 'public.riders'] })
    expect(table('deck.third_view').readsFrom).toEqual(['deck.first_view', 'deck.proved', 'deck.second_view', 'public.riders'])
    expect(table('deck.calling_view').readsFrom).toEqual(['deck.peek()'])
  })

  test('tells enums, domains, arrays, modifiers and collations apart, and leaves dropped columns and sequences out', () => {
    const columns = Object.fromEntries(table('deck.typed').columns.map((column) => [column.name, column]))
    expect(Object.keys(columns)).toEqual(['fare', 'sky', 'price', 'tags', 'note', 'caseless', 'Odd "name" é', 'gone'])
    expect(columns['fare']?.type).toEqual({ schema: 'pg_catalog', name: 'numeric', printed: 'numeric(10,2)', modifier: 655366, kind: 'base', labels: [] })
    expect(columns['sky']?.type).toMatchObject({ schema: 'deck', name: 'weather', kind: 'enum', labels: ['fog', 'calm', 'gale'] })
    expect(columns['price']?.type).toMatchObject({ schema: 'deck', name: 'pence', kind: 'domain' })
    expect(columns['tags']?.type.kind).toBe('other')
    expect([columns['note']?.deterministic, columns['caseless']?.deterministic]).toEqual([true, false])
    expect(catalog.tables.some((each) => each.name === 'counter')).toBe(false)
  })

  test('counts a column with an unvalidated NOT NULL constraint as nullable', async () => {
    if (catalog.serverVersion < 180000) return
    await client.query(
      'CREATE TABLE deck.hasty (id integer UNIQUE); INSERT INTO deck.hasty VALUES (NULL), (NULL); ALTER TABLE deck.hasty ADD CONSTRAINT later NOT NULL id NOT VALID',
    )
    const [hasty] = (await readCatalog(client, ['deck'])).tables.filter((each) => each.name === 'hasty')
    expect([hasty?.columns[0]?.notNull, hasty?.uniqueKeys]).toEqual([false, []])
  })

  test('takes a key without overlaps as no proof', async () => {
    if (catalog.serverVersion < 180000) return
    await client.query('CREATE EXTENSION btree_gist; CREATE TABLE deck.berths (berth integer, taken daterange, PRIMARY KEY (berth, taken WITHOUT OVERLAPS))')
    const [berths] = (await readCatalog(client, ['deck'])).tables.filter((each) => each.name === 'berths')
    expect([berths?.primaryKey, berths?.uniqueKeys]).toEqual([null, []])
  })

  test('reads the schemas that foreign keys and views lead to as well', async () => {
    await client.query(
      'CREATE SCHEMA office; CREATE TABLE office.desks (rider_id integer REFERENCES public.riders); CREATE SCHEMA hall; CREATE VIEW hall.screen AS SELECT 1 AS shown FROM office.desks',
    )
    const seen = await readCatalog(client, ['hall'])
    expect(seen.tables.map((each) => `${each.schema}.${each.name}`)).toEqual([
      'hall.screen',
      'office.desks',
      'public.complaints',
      'public.piers',
      'public.riders',
      'public.trips',
    ])
  })

  test('needs no more than the right to connect', async () => {
    const role = server.uniqueName('reader')
    await client.query(`CREATE ROLE ${role}`)
    try {
      await client.query(`SET ROLE ${role}`)
      const seen = await readCatalog(client, ['public'])
      expect(seen.tables.map((each) => each.name)).toEqual(['complaints', 'piers', 'riders', 'trips'])
    } finally {
      await client.query('RESET ROLE')
      await client.query(`DROP ROLE ${role}`)
    }
  })
})
