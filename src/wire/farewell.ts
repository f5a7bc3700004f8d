import type { Socket } from 'node:net'

const patienceMs = 2_000

/** Sends a last frame, ends the socket, and takes it away where the other side will not have it. */
export function farewell(socket: Socket, last: Buffer | null): void {
  if (socket.destroyed) return
  if (last === null) socket.end()
  else socket.end(last)
  // Unread bytes would turn the end into a reset that can overtake the last frame.
  socket.resume()
  const timer = setTimeout(() => socket.destroy(), patienceMs)
  socket.once('close', () => clearTimeout(timer))
}
