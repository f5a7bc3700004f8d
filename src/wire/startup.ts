import { Breach } from './breach.ts'
import { int32 } from './messages.ts'

export const sslRequest = 80877103
export const gssRequest = 80877104
export const cancelRequest = 80877102

/** What a StartupMessage asks for. A name that is not UTF-8 is null: nobody's. */
export interface Startup {
  readonly major: number
  readonly minor: number
  readonly user: string | null
  readonly database: string | null
  /** Parameters beginning with `_pq_.`, which ask for more than protocol 3.0. */
  readonly protocolOptions: readonly string[]
  /** The packet to send on: the very bytes, less `replication`. */
  readonly packet: Buffer
}

/** Reads a whole StartupMessage (length and version included); throws Breach as PostgreSQL would. */
export function readStartup(packet: Buffer): Startup {
  const version = packet.readUInt32BE(4)
  const major = version >>> 16
  const minor = version & 0xffff
  if (major !== 3) throw new Breach('0A000', `unsupported frontend protocol ${major}.${minor}: server supports 3.0 to 3.2`)
  const pairs = readPairs(packet)
  // PostgreSQL takes the last of a repeated parameter: whoever is judged here must be who logs in there.
  const last = (name: string) => pairs.findLast((pair) => pair.name === name)?.value
  const user = last('user')
  if (user === undefined || user.length === 0) throw new Breach('28000', 'no PostgreSQL user name specified in startup packet')
  const database = last('database')
  return {
    major,
    minor,
    user: utf8(user),
    database: utf8(database === undefined || database.length === 0 ? user : database),
    protocolOptions: pairs.map((pair) => pair.name).filter((name) => name.startsWith('_pq_.')),
    packet: withoutReplication(packet, pairs),
  }
}

interface Pair {
  readonly name: string
  readonly value: Buffer
  readonly bytes: Buffer
}

function readPairs(packet: Buffer): readonly Pair[] {
  const pairs: Pair[] = []
  let at = 8
  while (at < packet.length && packet[at] !== 0) {
    const nameEnd = packet.indexOf(0, at)
    const valueEnd = nameEnd < 0 ? -1 : packet.indexOf(0, nameEnd + 1)
    if (valueEnd < 0) throw layout()
    pairs.push({ name: packet.toString('latin1', at, nameEnd), value: packet.subarray(nameEnd + 1, valueEnd), bytes: packet.subarray(at, valueEnd + 1) })
    at = valueEnd + 1
  }
  if (at !== packet.length - 1) throw layout()
  return pairs
}

function layout(): Breach {
  return new Breach('08P01', 'invalid startup packet layout: expected terminator as last byte')
}

function withoutReplication(packet: Buffer, pairs: readonly Pair[]): Buffer {
  const kept = pairs.filter((pair) => pair.name !== 'replication')
  if (kept.length === pairs.length) return packet
  const body = Buffer.concat([packet.subarray(4, 8), ...kept.map((pair) => pair.bytes), Buffer.from([0])])
  return Buffer.concat([int32(4 + body.length), body])
}

function utf8(bytes: Buffer): string | null {
  try {
    return new TextDecoder('utf-8', { fatal: true, ignoreBOM: true }).decode(bytes)
  } catch {
    return null
  }
}
