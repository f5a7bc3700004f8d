import { mkdtemp, readdir, rm, stat } from 'node:fs/promises'
import { tmpdir } from 'node:os'
import { dirname, join } from 'node:path'
import { serversOf } from '../../src/embedded/processes.ts'
import { startServer } from '../../src/embedded/server.ts'

/** A PostgreSQL that tests run on. */
export interface TestBackend {
  /** The superuser's URL of the maintenance database. */
  readonly url: string
  stop(): Promise<void>
}

const settings = {
  fsync: 'off',
  synchronous_commit: 'off',
  full_page_writes: 'off',
  max_connections: '200',
  shared_buffers: '64MB',
  max_wal_size: '512MB',
  io_method: 'sync',
  autovacuum_naptime: '5min',
  max_prepared_transactions: '10',
}

/**
 * The server named by HEDGEROW_TEST_DATABASE_URL where it is set; a container of the image HEDGEROW_TEST_IMAGE where that is set; else the embedded server, in a directory that goes
 * away with it.
 */
export async function testBackend(environment: NodeJS.ProcessEnv = process.env): Promise<TestBackend> {
  const given = environment['HEDGEROW_TEST_DATABASE_URL'] ?? ''
  if (given !== '') return { url: given, stop: async () => undefined }
  const image = environment['HEDGEROW_TEST_IMAGE'] ?? ''
  return image === '' ? await embedded() : await container(image)
}

async function embedded(): Promise<TestBackend> {
  await sweep()
  const directory = await mkdtemp(join(tmpdir(), 'hedgerow-test-'))
  const server = await startServer({ directory, settings })
  return {
    url: server.url(),
    stop: async () => {
      await server.stop()
      await rm(directory, { recursive: true, force: true })
    },
  }
}

/** What killed runs left behind an hour ago or longer; the servers themselves ended with them. */
async function sweep(): Promise<void> {
  const names = (await readdir(tmpdir())).filter((name) => name.startsWith('hedgerow-test-'))
  for (const directory of names.map((name) => join(tmpdir(), name, 'postgresql'))) {
    const found = await stat(join(directory, 'password')).catch(() => undefined)
    if (found === undefined || Date.now() - found.mtimeMs < 3_600_000 || (await serversOf(join(directory, 'data'))).length > 0) continue
    await rm(dirname(directory), { recursive: true, force: true }).catch(() => undefined)
  }
}

async function container(image: string): Promise<TestBackend> {
  const { GenericContainer, Wait } = await import('testcontainers')
  const password = 'harbour'
  const wanted = new GenericContainer(image)
    .withEnvironment({ POSTGRES_PASSWORD: password })
    .withCommand(['postgres', '-c', 'fsync=off', '-c', 'max_connections=200', '-c', 'max_prepared_transactions=10'])
    .withExposedPorts(5432)
    .withWaitStrategy(Wait.forLogMessage(/database system is ready to accept connections/, 2))
  const started = await wanted.start().catch((error: unknown) => {
    throw new Error(
      `HEDGEROW_TEST_IMAGE is ${image}, but no container of it starts (${error instanceof Error ? error.message : 'unknown'}): see that a Docker engine answers, or unset it to test on the embedded server`,
    )
  })
  return {
    url: `postgresql://postgres:${password}@${started.getHost()}:${started.getMappedPort(5432)}/postgres`,
    stop: async () => {
      await started.stop()
    },
  }
}
