import { createHash, createHmac, pbkdf2Sync, randomBytes } from 'node:crypto'
import { connect, type Socket } from 'node:net'
import { readFields } from '../../src/wire/error-frame.ts'
import { frame, int32 } from '../../src/wire/messages.ts'

export interface Received {
  readonly type: string
  readonly body: Buffer
  readonly bytes: Buffer
}

/** A client that speaks bytes: it sends what it is told and collects whole frames. */
export class RawClient {
  readonly socket: Socket
  readonly received: Received[] = []
  closed = false
  #buffer: Buffer = Buffer.alloc(0)
  #wake: () => void = () => undefined

  constructor(socket: Socket) {
    this.socket = socket
    socket.setNoDelay(true)
    socket.on('error', () => undefined)
    socket.on('data', (chunk: Buffer) => {
      this.#buffer = Buffer.concat([this.#buffer, chunk])
      while (this.#buffer.length >= 5 && this.#buffer.length >= 1 + this.#buffer.readUInt32BE(1)) {
        const end = 1 + this.#buffer.readUInt32BE(1)
        const bytes = this.#buffer.subarray(0, end)
        this.received.push({ type: String.fromCharCode(bytes[0]!), body: bytes.subarray(5), bytes })
        this.#buffer = this.#buffer.subarray(end)
      }
      this.#wake()
    })
    socket.on('close', () => {
      this.closed = true
      this.#wake()
    })
  }

  static async open(port: number): Promise<RawClient> {
    const socket = connect(port, '127.0.0.1')
    await new Promise<void>((resolve, reject) => {
      socket.once('connect', resolve)
      socket.once('error', reject)
    })
    return new RawClient(socket)
  }

  send(...parts: readonly Uint8Array[]): void {
    this.socket.write(Buffer.concat(parts))
  }

  /** Frames from now on, up to the first of `type`, or to the end of the connection. */
  async until(type: string, timeoutMs = 8_000): Promise<readonly Received[]> {
    const deadline = Date.now() + timeoutMs
    for (;;) {
      const at = this.received.findIndex((each) => each.type === type)
      if (at >= 0) return this.received.splice(0, at + 1)
      if (this.closed) return this.received.splice(0)
      const left = deadline - Date.now()
      if (left <= 0) throw new Error(`no ${type} within ${timeoutMs} ms, but ${this.received.map((each) => each.type).join('')}`)
      await new Promise<void>((resolve) => {
        const timer = setTimeout(resolve, left)
        this.#wake = () => {
          clearTimeout(timer)
          resolve()
        }
      })
    }
  }

  /** Start-up and SCRAM; resolves with everything up to ReadyForQuery or the end. */
  async logIn(user: string, database: string, password: string, extra: Readonly<Record<string, string>> = {}): Promise<readonly Received[]> {
    this.send(startupPacket({ user, database, ...extra }))
    const first = await this.until('R')
    const request = first.at(-1)
    if (request?.type !== 'R') return first
    const nonce = randomBytes(12).toString('base64')
    const bare = `n=,r=${nonce}`
    this.send(frame('p', Buffer.from('SCRAM-SHA-256\0'), int32(3 + bare.length), Buffer.from(`n,,${bare}`)))
    const challenge = (await this.until('R')).at(-1)
    if (challenge?.type !== 'R') return [...first, ...(challenge === undefined ? [] : [challenge])]
    this.send(frame('p', Buffer.from(finalMessage(password, bare, challenge.body.toString('latin1', 4)))))
    const rest = await this.until('Z')
    return [...first, challenge, ...rest]
  }
}

export function startupPacket(parameters: Readonly<Record<string, string>>, version = 196_608): Buffer {
  const pairs = Object.entries(parameters).map(([name, value]) => `${name}\0${value}\0`)
  const body = Buffer.concat([int32(version), Buffer.from(`${pairs.join('')}\0`)])
  return Buffer.concat([int32(4 + body.length), body])
}

export function query(text: string): Buffer {
  return frame('Q', Buffer.from(`${text}\0`))
}

/** Parse, Bind, Describe, Execute of the unnamed statement, without Sync. */
export function extended(text: string, parameters: readonly string[] = []): Buffer {
  const values = parameters.map((value) => Buffer.concat([int32(Buffer.byteLength(value)), Buffer.from(value)]))
  const count = Buffer.alloc(2)
  count.writeInt16BE(parameters.length)
  return Buffer.concat([
    frame('P', Buffer.from(`\0${text}\0\0\0`)),
    frame('B', Buffer.from('\0\0\0\0'), count, ...values, Buffer.from('\0\0')),
    frame('D', Buffer.from('P\0')),
    frame('E', Buffer.from('\0\0\0\0\0')),
  ])
}

export const sync = frame('S')

/** The fields of an error or notice, by letter. */
export function fields(received: Received | undefined): Readonly<Record<string, string>> {
  return Object.fromEntries(received === undefined ? [] : (readFields(received.bytes) ?? []))
}

function finalMessage(password: string, bare: string, challenge: string): string {
  const [, nonce = '', salt = '', iterations = ''] = /^r=([^,]*),s=([^,]*),i=(\d+)$/.exec(challenge) ?? []
  const salted = pbkdf2Sync(password, Buffer.from(salt, 'base64'), Number(iterations), 32, 'sha256')
  const mac = (key: Uint8Array, text: string) => createHmac('sha256', key).update(text).digest()
  const clientKey = mac(salted, 'Client Key')
  const withoutProof = `c=biws,r=${nonce}`
  const signature = mac(createHash('sha256').update(clientKey).digest(), `${bare},${challenge},${withoutProof}`)
  return `${withoutProof},p=${Buffer.from(clientKey.map((byte, index) => byte ^ signature[index]!)).toString('base64')}`
}
