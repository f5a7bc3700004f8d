import { randomBytes } from 'node:crypto'
import { createServer, type AddressInfo, type Socket } from 'node:net'
import { createSecureContext } from 'node:tls'
import { complaintFrame } from './error-frame.ts'
import { farewell } from './farewell.ts'
import { listening } from './listening.ts'
import { receive, type Reception } from './receive.ts'
import type { Session } from './relay.ts'
import type { WireOptions } from './wire-options.ts'

/** A wire that listens. */
export interface Wire {
  readonly port: number
  /** The analysts' sessions of now, by the process number of their lobby backend. */
  sessions(): ReadonlyMap<number, Session>
  /** Takes no more connections, lets what is under way finish, then ends every session as a PostgreSQL that shuts down would. */
  close(): Promise<void>
}

/** Listens for analysts' clients. Rejects where the port cannot be had or the certificate cannot be read. */
export async function serveClients(options: WireOptions): Promise<Wire> {
  const { log, ceilings } = options
  const sessions = new Map<number, Session>()
  const sockets = new Set<Socket>()
  const addresses = new Map<string, number>()
  let closing: Promise<void> | null = null
  const goodbye = (session: Session) => session.end('57P01', 'terminating connection due to administrator command')
  const reception: Reception = {
    ...options,
    secureContext: options.tls === null ? null : createSecureContext(options.tls),
    decoySecret: options.decoySecret ?? randomBytes(32),
    saltOf: options.saltOf ?? (() => null),
    onOpen: (session) => sessions.set(session.pid, session),
    onReady: (session) => {
      if (closing !== null && session.idle) goodbye(session)
    },
    onEnd: (session) => {
      if (sessions.get(session.pid) === session) sessions.delete(session.pid)
    },
  }
  const server = createServer({ noDelay: true, keepAlive: true, keepAliveInitialDelay: 30_000, pauseOnConnect: false }, (socket) => {
    const address = socket.remoteAddress ?? ''
    const here = (addresses.get(address) ?? 0) + 1
    socket.on('error', () => undefined)
    if (sockets.size >= ceilings.connections || here > ceilings.connectionsPerAddress) {
      log('warn', 'wire.too_many', { address, connections: sockets.size })
      return farewell(socket, complaintFrame({ severity: 'FATAL', sqlstate: '53300', message: 'sorry, too many clients already' }))
    }
    sockets.add(socket)
    addresses.set(address, here)
    socket.once('close', () => {
      sockets.delete(socket)
      const left = (addresses.get(address) ?? 1) - 1
      if (left > 0) addresses.set(address, left)
      else addresses.delete(address)
    })
    void receive(socket, address, reception)
  })
  const drain = async (): Promise<void> => {
    const closed = new Promise<void>((resolve) => server.close(() => resolve()))
    for (const session of sessions.values()) if (session.idle) goodbye(session)
    const deadline = Date.now() + options.drainMs
    while (sessions.size > 0 && Date.now() < deadline) await new Promise((resolve) => setTimeout(resolve, 20))
    for (const session of sessions.values()) goodbye(session)
    // Whoever has not logged in, or does not read the farewell.
    const strays = setTimeout(() => {
      for (const socket of sockets) socket.destroy()
    }, 500)
    await closed
    clearTimeout(strays)
  }
  await listening(server, options.port, options.host)
  server.on('error', (error) => log('error', 'wire.listener', { fault: error.name }))
  return {
    port: (server.address() as AddressInfo).port,
    sessions: () => sessions,
    close: () => (closing ??= drain()),
  }
}
