import type { Socket } from 'node:net'
import { TLSSocket, type SecureContext } from 'node:tls'
import { Breach } from './breach.ts'
import { ByteReader } from './byte-reader.ts'
import { cancelRequest, gssRequest, readStartup, sslRequest, type Startup } from './startup.ts'

/** What a connection turned out to be, once encryption is settled. `socket` is the encrypted one where TLS was agreed on. */
export type Opening =
  | { readonly kind: 'cancel'; readonly packet: Buffer }
  | { readonly kind: 'startup'; readonly startup: Startup; readonly socket: Socket; readonly reader: ByteReader }

const longestCancel = 12 + 256

/**
 * Reads a connection up to its StartupMessage or CancelRequest. `onSocket` is told of the encrypted socket as soon as there is one, so that the
 * caller can end it. Throws Breach, or Gone.
 */
export async function greet(plain: Socket, tls: SecureContext | null, ceiling: number, onSocket: (socket: Socket) => void): Promise<Opening> {
  let socket = plain
  let reader = new ByteReader(socket, ceiling)
  let asked: ReadonlySet<number> = new Set()
  for (;;) {
    const head = await reader.exactly(8)
    const length = head.readInt32BE(0)
    const code = head.readUInt32BE(4)
    if (length < 8 || length > ceiling) throw new Breach('08P01', 'invalid length of startup packet')
    if ((code === sslRequest || code === gssRequest) && length === 8 && !asked.has(code)) {
      asked = new Set([...asked, code])
      // Plaintext sent ahead of the handshake could be taken for what was said under it.
      if (reader.waiting > 0) {
        throw new Breach(
          '08P01',
          `received unencrypted data after ${code === sslRequest ? 'SSL' : 'GSSAPI encryption'} request`,
          'This is a fault of the client, or someone in between.',
        )
      }
      if (code === gssRequest || tls === null || socket !== plain) {
        socket.write('N')
        continue
      }
      reader.leave()
      socket.write('S')
      socket = new TLSSocket(plain, { isServer: true, secureContext: tls })
      socket.on('error', () => plain.destroy())
      onSocket(socket)
      reader = new ByteReader(socket, ceiling)
      continue
    }
    if (code === cancelRequest) {
      if (length < 16 || length > longestCancel) throw new Breach('08P01', 'invalid length of startup packet')
      return { kind: 'cancel', packet: Buffer.concat([head, await reader.exactly(length - 8)]) }
    }
    return { kind: 'startup', startup: readStartup(Buffer.concat([head, await reader.exactly(length - 8)])), socket, reader }
  }
}
