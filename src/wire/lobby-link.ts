import { connect, type Socket } from 'node:net'

/** Where the lobby listens; a host that begins with a slash is the directory of its local socket. */
export interface LobbyAddress {
  readonly host: string
  readonly port: number
}

const cancelPatienceMs = 5_000

/** A socket to the lobby, connected; rejects after `timeoutMs`. */
export function connectLobby(lobby: LobbyAddress, timeoutMs: number): Promise<Socket> {
  return new Promise((resolve, reject) => {
    const socket = connect(lobby.host.startsWith('/') ? { path: `${lobby.host}/.s.PGSQL.${lobby.port}` } : { host: lobby.host, port: lobby.port })
    const timer = setTimeout(() => socket.destroy(new Error('the lobby did not answer in time')), timeoutMs)
    socket.once('error', (error) => {
      clearTimeout(timer)
      reject(error)
    })
    socket.once('connect', () => {
      clearTimeout(timer)
      socket.removeAllListeners('error')
      socket.on('error', () => undefined)
      socket.setNoDelay(true)
      if (!lobby.host.startsWith('/')) socket.setKeepAlive(true, 30_000)
      socket.pause()
      resolve(socket)
    })
  })
}

/** Brings a CancelRequest packet to the lobby; resolves when the lobby has taken it, or could not be reached. */
export async function cancelAtLobby(lobby: LobbyAddress, packet: Uint8Array): Promise<void> {
  let socket: Socket
  try {
    socket = await connectLobby(lobby, cancelPatienceMs)
  } catch {
    return
  }
  await new Promise<void>((resolve) => {
    const timer = setTimeout(() => socket.destroy(), cancelPatienceMs)
    socket.once('close', () => {
      clearTimeout(timer)
      resolve()
    })
    socket.resume()
    socket.write(packet)
  })
}

/** Ends a lobby connection so that its backend's next read or write fails, whatever is still on the way to it. */
export function dropLobby(socket: Socket, lobby: LobbyAddress): void {
  if (socket.destroyed) return
  if (lobby.host.startsWith('/')) socket.destroy()
  else socket.resetAndDestroy()
}
