/** The few messages that are made or read here; layouts from "Message Formats" in PostgreSQL's documentation. */

/** A whole typed frame around `body`. */
export function frame(type: string, ...body: readonly Uint8Array[]): Buffer {
  const header = Buffer.allocUnsafe(5)
  header.write(type, 0, 'latin1')
  header.writeInt32BE(
    body.reduce((sum, part) => sum + part.length, 4),
    1,
  )
  return Buffer.concat([header, ...body])
}

export function int32(value: number): Buffer {
  const bytes = Buffer.allocUnsafe(4)
  bytes.writeInt32BE(value)
  return bytes
}

export function int16(value: number): Buffer {
  const bytes = Buffer.allocUnsafe(2)
  bytes.writeInt16BE(value)
  return bytes
}

export function cString(text: string): Buffer {
  return Buffer.from(`${text}\0`, 'utf8')
}

export const authenticationOk = frame('R', int32(0))

export function authenticationSasl(mechanism: string): Buffer {
  return frame('R', int32(10), cString(mechanism), Buffer.from([0]))
}

export function authenticationContinue(data: string): Buffer {
  return frame('R', int32(11), Buffer.from(data))
}

export function authenticationFinal(data: string): Buffer {
  return frame('R', int32(12), Buffer.from(data))
}

export function parameterStatus(name: string, value: string): Buffer {
  return frame('S', cString(name), cString(value))
}

export function readyForQuery(status: 'I'): Buffer {
  return frame('Z', Buffer.from(status, 'latin1'))
}

/** The name and value of a whole ParameterStatus frame. */
export function readParameterStatus(bytes: Buffer): readonly [name: string, value: string] {
  const [name = '', value = ''] = bytes.toString('utf8', 5).split('\0')
  return [name, value]
}

/** The mechanism and the first message of a SASLInitialResponse's body; null where it is malformed. */
export function readSaslInitial(body: Buffer): { readonly mechanism: string; readonly data: Buffer } | null {
  const end = body.indexOf(0)
  if (end < 0 || body.length < end + 5) return null
  const length = body.readInt32BE(end + 1)
  const data = body.subarray(end + 5)
  if (length === -1 ? data.length > 0 : length !== data.length) return null
  return { mechanism: body.toString('latin1', 0, end), data }
}

/** A Query or Parse frame taken apart: `before` and `after` are what surrounds the text and its closing NUL. */
export interface StatementFrame {
  readonly type: 'Q' | 'P'
  readonly before: Buffer
  readonly text: Buffer
  readonly after: Buffer
}

/** Null where the frame is malformed: then PostgreSQL's own complaint about it is the best there is. */
export function readStatement(bytes: Buffer): StatementFrame | null {
  if (bytes[0] === 0x51) {
    if (bytes.indexOf(0, 5) !== bytes.length - 1) return null
    return { type: 'Q', before: bytes.subarray(5, 5), text: bytes.subarray(5, bytes.length - 1), after: bytes.subarray(bytes.length) }
  }
  const name = bytes.indexOf(0, 5)
  const end = name < 0 ? -1 : bytes.indexOf(0, name + 1)
  if (end < 0 || bytes.length < end + 3) return null
  if (bytes.length !== end + 3 + 4 * bytes.readUInt16BE(end + 1)) return null
  return { type: 'P', before: bytes.subarray(5, name + 1), text: bytes.subarray(name + 1, end), after: bytes.subarray(end + 1) }
}

/** The parameter type oids of a Parse, [] for a Query. */
export function parameterTypes(statement: StatementFrame): readonly number[] {
  const types: number[] = []
  for (let at = 2; at + 4 <= statement.after.length; at += 4) types.push(statement.after.readUInt32BE(at))
  return types
}

/** The frame with another text in the place of its own. */
export function withText(statement: StatementFrame, text: Uint8Array): Buffer {
  return frame(statement.type, statement.before, text, Buffer.from([0]), statement.after)
}
