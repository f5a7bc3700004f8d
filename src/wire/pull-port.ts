import { randomBytes } from 'node:crypto'
import { createServer, type AddressInfo, type Socket } from 'node:net'
import type { AnswerPull } from '../answer/ports.ts'
import type { Log } from '../base/ports.ts'
import { Breach, Gone } from './breach.ts'
import { complaintFrame } from './error-frame.ts'
import { farewell } from './farewell.ts'
import { greet } from './greet.ts'
import { listening } from './listening.ts'
import { int32 } from './messages.ts'
import { admitPuller } from './pull-login.ts'
import { PullSession } from './pull-session.ts'
import { scramKeys } from './scram.ts'

/** How much the pull port takes. */
export interface PullCeilings {
  /** Bytes of a message before log-in, and of one after it. */
  readonly beforeLogin: number
  readonly message: number
  readonly connections: number
}

/** Every analyst's session of the lobby keeps one connection. */
export const pullCeilings: PullCeilings = { beforeLogin: 10_000, message: 8_388_608, connections: 400 }

/** What `servePulls` works with. */
export interface PullPortOptions {
  /** 127.0.0.1 unless the lobby is on another machine. */
  readonly host?: string
  /** 0 takes any free one. */
  readonly port: number
  readonly user: 'hedgerow'
  readonly password: string
  readonly answer: AnswerPull
  readonly log: Log
  readonly ceilings: PullCeilings
  readonly loginTimeoutMs: number
}

/** A pull port that listens. */
export interface PullPort {
  readonly port: number
  /** Aborts what is being answered and ends every connection. */
  close(): Promise<void>
}

/**
 * Serves the lobby's `hedgerow.*` functions: as much of PostgreSQL's protocol as libpq needs, database `pull`, one kind of query. Nothing is
 * answered before a SCRAM log-in. Rejects where the port cannot be had.
 */
export async function servePulls(options: PullPortOptions): Promise<PullPort> {
  const { log, ceilings, loginTimeoutMs } = options
  const keys = scramKeys(options.password)
  const decoySecret = randomBytes(32)
  const sockets = new Set<Socket>()
  const sessions = new Map<number, PullSession>()
  let lastPid = 0

  const serve = async (socket: Socket): Promise<void> => {
    const timer = setTimeout(() => socket.destroy(), loginTimeoutMs)
    let session: PullSession | null = null
    try {
      const opening = await greet(socket, null, ceilings.beforeLogin, () => undefined)
      if (opening.kind === 'cancel') {
        sessions.get(opening.packet.readUInt32BE(8))?.cancel(opening.packet.subarray(12))
        return void socket.end()
      }
      lastPid = (lastPid % 0x7fff_ffff) + 1
      const key = Buffer.concat([int32(lastPid), randomBytes(4)])
      await admitPuller(opening, { user: options.user, keys, decoySecret, ceiling: ceilings.beforeLogin, key })
      clearTimeout(timer)
      session = new PullSession(socket, opening.reader, key, options.answer, log, ceilings.message)
      sessions.set(session.pid, session)
      await session.run()
      farewell(socket, null)
    } catch (error) {
      if (error instanceof Breach) {
        log('warn', error.sqlstate === '28P01' ? 'pull.login_failed' : 'pull.turned_away', { address: socket.remoteAddress ?? '', sqlstate: error.sqlstate })
        farewell(socket, complaintFrame({ severity: 'FATAL', sqlstate: error.sqlstate, message: error.message, detail: error.detail }))
      } else {
        if (!(error instanceof Gone)) log('error', 'pull.broken', { fault: error instanceof Error ? error.name : 'unknown' })
        socket.destroy()
      }
    } finally {
      clearTimeout(timer)
      if (session !== null) sessions.delete(session.pid)
    }
  }

  const server = createServer({ noDelay: true, keepAlive: true, keepAliveInitialDelay: 30_000 }, (socket) => {
    socket.on('error', () => undefined)
    if (sockets.size >= ceilings.connections) {
      log('warn', 'pull.too_many', { connections: sockets.size })
      return farewell(socket, complaintFrame({ severity: 'FATAL', sqlstate: '53300', message: 'too many connections to the pull port' }))
    }
    sockets.add(socket)
    socket.once('close', () => sockets.delete(socket))
    void serve(socket)
  })
  await listening(server, options.port, options.host ?? '127.0.0.1')
  server.on('error', (error) => log('error', 'pull.listener', { fault: error.name }))
  return {
    port: (server.address() as AddressInfo).port,
    async close() {
      const closed = new Promise<void>((resolve) => server.close(() => resolve()))
      for (const socket of sockets) socket.destroy()
      await closed
    },
  }
}
