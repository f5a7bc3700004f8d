import { mkdtempSync, rmSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import pg from 'pg'
import { inject } from 'vitest'
import { testBackend } from './backend.ts'
import type { TestBackend } from './backend.ts'

declare module 'vitest' {
  export interface ProvidedContext {
    /** A superuser's URL of the server that the whole test run shares; '' where each worker starts its own. */
    hedgerowTestServer: string
  }
}

/** A PostgreSQL for tests, seen as its superuser. Other tests use it at the same time: names of databases and roles must be unlike theirs. */
export interface TestServer {
  readonly host: string
  readonly port: number
  /** The superuser's connection string; without a name, of the maintenance database. */
  url(database?: string): string
  /** Makes an empty database whose name starts with `prefix` and returns the superuser's URL of it. */
  createDatabase(prefix: string): Promise<string>
  /** A name that no other test uses, for roles above all: they are the whole server's. */
  uniqueName(prefix: string): string
  /** Drops the databases made through this object, and stops what was started for it. */
  stop(): Promise<void>
}

let counter = 0

/** The server of the test run where there is one, else one started for the caller (see `testBackend`). */
export async function testServer(): Promise<TestServer> {
  const shared = sharedServer()
  const backend: TestBackend = shared === '' ? await testBackend() : { url: shared, stop: async () => undefined }
  const base = new URL(backend.url)
  const made: string[] = []
  const url = (database?: string): string => {
    const copy = new URL(base)
    if (database !== undefined) copy.pathname = `/${encodeURIComponent(database)}`
    return copy.href
  }
  const uniqueName = (prefix: string): string => `${prefix}_${process.pid}_${Date.now().toString(36)}_${++counter}`
  return {
    host: base.hostname,
    port: Number(base.port || 5432),
    url,
    uniqueName,
    createDatabase: async (prefix) => {
      const name = uniqueName(prefix)
      await asSuperuser(backend.url, `CREATE DATABASE ${pg.escapeIdentifier(name)} TEMPLATE template0 ENCODING 'UTF8'`)
      made.push(name)
      return url(name)
    },
    stop: async () => {
      for (const name of made.splice(0)) await asSuperuser(backend.url, `DROP DATABASE IF EXISTS ${pg.escapeIdentifier(name)} WITH (FORCE)`)
      await backend.stop()
    },
  }
}

function sharedServer(): string {
  try {
    return inject('hedgerowTestServer') ?? ''
  } catch {
    return ''
  }
}

async function asSuperuser(url: string, sql: string): Promise<void> {
  const client = new pg.Client({ connectionString: url })
  client.on('error', () => undefined)
  await client.connect()
  try {
    await client.query(sql)
  } finally {
    await client.end()
  }
}

/** A directory of mode 0700 that is removed when `remove` is called. */
export function scratchDirectory(prefix: string): { readonly path: string; remove(): void } {
  const path = mkdtempSync(join(tmpdir(), `${prefix}-`))
  return { path, remove: () => rmSync(path, { recursive: true, force: true }) }
}
