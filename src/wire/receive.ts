import type { Socket } from 'node:net'
import type { SecureContext } from 'node:tls'
import { Breach, Gone } from './breach.ts'
import { complaintFrame } from './error-frame.ts'
import { farewell } from './farewell.ts'
import { greet, type Opening } from './greet.ts'
import { cancelAtLobby, connectLobby } from './lobby-link.ts'
import { relay, type Session } from './relay.ts'
import { decoyKeys, type ScramSalt } from './scram.ts'
import { scramLogin, wrongPassword } from './scram-login.ts'
import type { WireOptions } from './wire-options.ts'

/** What every connection of a listener shares. */
export interface Reception extends Omit<WireOptions, 'saltOf' | 'decoySecret'> {
  readonly secureContext: SecureContext | null
  readonly decoySecret: Uint8Array
  readonly saltOf: (user: string) => ScramSalt | null
  readonly onOpen: (session: Session) => void
  readonly onReady: (session: Session) => void
  readonly onEnd: (session: Session) => void
}

/** Sees one connection from its first byte to its end. Never rejects. */
export async function receive(plain: Socket, address: string, reception: Reception): Promise<void> {
  const { log, ceilings, loginTimeoutMs, lobby } = reception
  let socket = plain
  const timer = setTimeout(() => socket.destroy(), loginTimeoutMs)
  try {
    const opening = await greet(plain, reception.secureContext, ceilings.beforeLogin, (encrypted) => {
      socket = encrypted
    })
    if (opening.kind === 'cancel') {
      await cancelAtLobby(lobby, opening.packet)
      return void socket.end()
    }
    await admit(opening, address, reception, timer)
  } catch (error) {
    if (error instanceof Gone) socket.destroy()
    else if (error instanceof Breach) {
      if (error.sqlstate !== '28P01') log('warn', 'wire.turned_away', { address, sqlstate: error.sqlstate })
      farewell(socket, complaintFrame({ severity: 'FATAL', sqlstate: error.sqlstate, message: error.message, detail: error.detail }))
    } else {
      log('error', 'wire.broken', { address, fault: error instanceof Error ? error.name : 'unknown' })
      socket.destroy()
    }
  } finally {
    clearTimeout(timer)
  }
}

async function admit(opening: Opening & { readonly kind: 'startup' }, address: string, reception: Reception, timer: NodeJS.Timeout): Promise<void> {
  const { socket, reader, startup } = opening
  const { user, database } = startup
  const { log, gate, ceilings, loginTimeoutMs } = reception
  let lobby: Socket
  try {
    lobby = await connectLobby(reception.lobby, loginTimeoutMs)
  } catch {
    log('error', 'wire.lobby_unreachable', {})
    throw new Breach('57P03', 'the lobby cannot be reached')
  }
  try {
    if (user === null || database === null || !gate.admits(user, database)) {
      // The connection to the lobby stays silent: it is there so that a lobby that is away, or slow, looks alike to everyone.
      const name = user ?? ''
      await scramLogin(socket, reader, decoyKeys(reception.decoySecret, name, reception.saltOf(name)), ceilings.beforeLogin)
      log('warn', 'wire.login_failed', { user: name, database: database ?? '', address })
      throw wrongPassword(name)
    }
    clearTimeout(timer)
    let opened: Session | null = null
    lobby.write(startup.packet)
    const onOpen = (session: Session) => {
      opened = session
      reception.onOpen(session)
    }
    await relay(
      {
        client: socket,
        lobby,
        lobbyAddress: reception.lobby,
        user,
        database,
        address,
        gate,
        log,
        ceilings,
        loginTimeoutMs,
        onOpen,
        onReady: reception.onReady,
      },
      reader.leave(),
    )
    if (opened !== null) reception.onEnd(opened)
  } finally {
    // A relay that is over has ended its lobby connection itself, or is letting Terminate through.
    if (!lobby.writableEnded) lobby.destroy()
  }
}
