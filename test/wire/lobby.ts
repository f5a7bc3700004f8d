import { connect, createServer, type AddressInfo, type Socket } from 'node:net'
import pg from 'pg'
import type { Gate, GateVerdict } from '../../src/answer/ports.ts'
import { serveClients, type Wire } from '../../src/wire/listen.ts'
import { wireCeilings, type WireOptions } from '../../src/wire/wire-options.ts'
import { testServer, type TestServer } from '../harness/server.ts'

/** A database and a role on a real server, and a wire in front of it. */
export interface TestLobby {
  readonly server: TestServer
  readonly user: string
  readonly password: string
  readonly database: string
  readonly wire: Wire
  readonly events: string[]
  /** The analyst's connection string through the wire. */
  url(overrides?: { readonly user?: string; readonly password?: string; readonly database?: string }): string
  /** Straight to the server, as its superuser, in the lobby's database. */
  direct(): Promise<pg.Client>
  /** Another wire in front of the same lobby. */
  another(options: Partial<WireOptions>): Promise<Wire>
  stop(): Promise<void>
}

/** What the tests' gate does: texts that name `riders` become ones over a published table, texts that name `secrets` are refused. */
export function ferryGate(user: string, database: string): Gate & { readonly judged: string[] } {
  const judged: string[] = []
  return {
    judged,
    admits: (name, base) => name === user && base === database,
    mentions: (_, text) => /riders|secrets/.test(Buffer.from(text).toString('latin1')),
    judge: async ({ text }): Promise<GateVerdict> => {
      judged.push(text)
      await new Promise((resolve) => setTimeout(resolve, text.includes('slowly') ? 150 : 1))
      if (text.includes('untouched')) return { kind: 'untouched' }
      const refusals = [...text.matchAll(/secrets/g)].map((found, index) => ({
        marker: `refused_${judged.length}_${index}_`,
        refusal: { sqlstate: '42501', message: 'rows of people stay closed [rows.private]', hint: 'SELECT count(*) FROM riders', position: found.index + 1 },
      }))
      let place = 0
      const rewritten = text.replaceAll('secrets', () => `hedgerow.${refusals[place++]!.marker}()`).replaceAll('riders', 'hedgerow.stand_in(42)')
      return { kind: 'rewritten', text: rewritten, refusals }
    },
  }
}

export async function testLobby(options: Partial<WireOptions> = {}): Promise<TestLobby> {
  const server = await testServer()
  const database = new URL(await server.createDatabase('wire')).pathname.slice(1)
  const user = server.uniqueName('ana')
  const password = 'harbour'
  const events: string[] = []
  const direct = async () => {
    const client = new pg.Client({ connectionString: server.url(database) })
    client.on('error', () => undefined)
    await client.connect()
    return client
  }
  const admin = await direct()
  await admin.query(`
    CREATE ROLE ${user} LOGIN PASSWORD '${password}';
    CREATE SCHEMA hedgerow;
    GRANT USAGE ON SCHEMA hedgerow TO PUBLIC;
    CREATE FUNCTION hedgerow.stand_in(n int) RETURNS TABLE (rider int, pier text) LANGUAGE sql AS 'SELECT i, ''pier '' || i FROM generate_series(1, n) i';
    CREATE FUNCTION hedgerow.raise(state text) RETURNS int LANGUAGE plpgsql AS
      'BEGIN RAISE NOTICE ''spent 0.1''; IF state <> '''' THEN RAISE EXCEPTION ''the budget is spent'' USING ERRCODE = state, HINT = ''wait''; END IF; RETURN 1; END';
  `)
  await admin.end()
  const base: WireOptions = {
    host: '127.0.0.1',
    port: 0,
    lobby: { host: server.host, port: server.port },
    tls: null,
    gate: ferryGate(user, database),
    log: (_, event) => events.push(event),
    ceilings: wireCeilings,
    loginTimeoutMs: 5_000,
    drainMs: 2_000,
  }
  const wires: Wire[] = []
  const another = async (more: Partial<WireOptions>) => {
    const made = await serveClients({ ...base, ...options, ...more })
    wires.push(made)
    return made
  }
  const wire = await another({})
  return {
    server,
    user,
    password,
    database,
    wire,
    events,
    direct,
    another,
    url: (over = {}) => `postgresql://${over.user ?? user}:${over.password ?? password}@127.0.0.1:${wire.port}/${over.database ?? database}`,
    stop: async () => {
      await Promise.all(wires.map((each) => each.close()))
      const last = new pg.Client({ connectionString: server.url() })
      await last.connect()
      await last.query(`DROP DATABASE IF EXISTS ${database} WITH (FORCE)`)
      await last.query(`DROP ROLE ${user}`)
      await last.end()
      await server.stop()
    },
  }
}

/** A proxy that notes every byte on its way to the lobby. */
export async function tap(
  host: string,
  port: number,
): Promise<{ readonly port: number; readonly heard: () => Buffer; readonly connections: () => number; close(): void }> {
  const chunks: Buffer[] = []
  const sockets = new Set<Socket>()
  let connections = 0
  const listener = createServer((near) => {
    connections += 1
    const far = connect(port, host)
    for (const socket of [near, far]) {
      sockets.add(socket)
      socket.on('error', () => undefined)
      socket.on('close', () => [near, far].forEach((each) => each.destroy()))
    }
    near.on('data', (chunk: Buffer) => chunks.push(chunk))
    near.pipe(far)
    far.pipe(near)
  })
  await new Promise<void>((resolve) => listener.listen(0, '127.0.0.1', resolve))
  return {
    port: (listener.address() as AddressInfo).port,
    heard: () => Buffer.concat(chunks),
    connections: () => connections,
    close: () => {
      listener.close()
      for (const socket of sockets) socket.destroy()
    },
  }
}
