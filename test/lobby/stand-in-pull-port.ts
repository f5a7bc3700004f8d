import { createServer, type Socket } from 'node:net'
import type { AddressInfo } from 'node:net'
import type { PullReply, PullRequest } from '../../src/answer/ports.ts'

/** What a test answers with; `signal` aborts when the lobby hangs up. */
export type StandInAnswer = (request: PullRequest, signal: AbortSignal) => Promise<PullReply>

export interface StandInPullPort {
  readonly host: string
  readonly port: number
  readonly requests: PullRequest[]
  /** Sessions the lobby opened so far. */
  connections(): number
  /** Requests whose session ended before their reply. */
  aborted(): number
  answerWith(answer: StandInAnswer): void
  /** Ends every open session, as a restart of Hedgerow would. */
  dropSessions(): void
  close(): Promise<void>
}

/** Just enough of the PostgreSQL protocol for dblink: start-up, a clear-text password, simple queries of one row with one text column. */
export async function standInPullPort(password: string): Promise<StandInPullPort> {
  const requests: PullRequest[] = []
  const sockets = new Set<Socket>()
  let connections = 0
  let aborted = 0
  let answer: StandInAnswer = async () => ({ kind: 'rows', rows: [], notice: '' })
  const server = createServer((socket) => {
    connections += 1
    sockets.add(socket)
    const ended = new AbortController()
    let pending = Buffer.alloc(0)
    let started = false
    socket.on('error', () => undefined)
    socket.on('close', () => {
      sockets.delete(socket)
      ended.abort()
    })
    socket.on('data', (bytes: Buffer) => {
      pending = Buffer.concat([pending, bytes])
      for (;;) {
        const at = started ? 1 : 0
        if (pending.length < at + 4) return
        const length = pending.readInt32BE(at) + at
        if (pending.length < length) return
        const frame = pending.subarray(0, length)
        pending = pending.subarray(length)
        if (!started) {
          const code = frame.readInt32BE(4)
          if (code === 80877103 || code === 80877104) socket.write('N')
          else {
            started = true
            socket.write(message('R', int32(3)))
          }
        } else onMessage(frame)
      }
    })
    function onMessage(frame: Buffer): void {
      const kind = String.fromCharCode(frame[0] ?? 0)
      const body = frame.subarray(5)
      if (kind === 'p') {
        if (body.toString('utf8', 0, body.length - 1) === password) {
          socket.write(
            Buffer.concat([
              message('R', int32(0)),
              parameter('client_encoding', 'UTF8'),
              parameter('server_encoding', 'UTF8'),
              parameter('standard_conforming_strings', 'on'),
              message('Z', Buffer.from('I')),
            ]),
          )
        } else {
          socket.end(message('E', Buffer.from('SFATAL\0C28P01\0Mpassword authentication failed for the pull port\0\0')))
        }
      } else if (kind === 'Q') {
        const text = body.toString('utf8', 0, body.length - 1)
        if (!text.startsWith('pull ')) {
          socket.write(Buffer.concat([message('C', Buffer.from('SET\0')), message('Z', Buffer.from('I'))]))
          return
        }
        const request = JSON.parse(text.slice(5)) as PullRequest
        requests.push(request)
        const lost = (): void => void (aborted += 1)
        ended.signal.addEventListener('abort', lost)
        void answer(request, ended.signal).then(
          (reply) => {
            ended.signal.removeEventListener('abort', lost)
            if (!ended.signal.aborted) socket.write(rowOf(JSON.stringify(reply)))
          },
          () => undefined,
        )
      } else if (kind === 'X') socket.end()
    }
  })
  await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve))
  return {
    host: '127.0.0.1',
    port: (server.address() as AddressInfo).port,
    requests,
    connections: () => connections,
    aborted: () => aborted,
    answerWith: (given) => {
      answer = given
    },
    dropSessions: () => {
      for (const socket of sockets) socket.destroy()
    },
    close: async () => {
      for (const socket of sockets) socket.destroy()
      await new Promise((resolve) => server.close(resolve))
    },
  }
}

function rowOf(text: string): Buffer {
  const value = Buffer.from(text)
  const description = Buffer.concat([
    Buffer.from([0, 1]),
    Buffer.from('reply\0'),
    int32(0),
    Buffer.from([0, 0]),
    int32(25),
    Buffer.from([255, 255]),
    int32(-1),
    Buffer.from([0, 0]),
  ])
  return Buffer.concat([
    message('T', description),
    message('D', Buffer.concat([Buffer.from([0, 1]), int32(value.length), value])),
    message('C', Buffer.from('SELECT 1\0')),
    message('Z', Buffer.from('I')),
  ])
}

function message(kind: string, body: Buffer): Buffer {
  return Buffer.concat([Buffer.from(kind), int32(body.length + 4), body])
}

function parameter(name: string, value: string): Buffer {
  return message('S', Buffer.from(`${name}\0${value}\0`))
}

function int32(value: number): Buffer {
  const bytes = Buffer.alloc(4)
  bytes.writeInt32BE(value)
  return bytes
}
