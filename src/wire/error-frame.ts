/**
 * One field of an ErrorResponse or NoticeResponse: its letter (S severity, C sqlstate, M message, D detail, H hint, P position, W context, …) and its
 * value, one character for each byte, so that a value in any client encoding survives.
 */
export type Field = readonly [letter: string, bytes: string]

/** What a complaint of ours says; '' and 0 leave a field out. */
export interface Complaint {
  readonly severity: 'ERROR' | 'FATAL'
  readonly sqlstate: string
  readonly message: string
  readonly detail?: string
  readonly hint?: string
  /** Characters from 1. */
  readonly position?: number
}

/** The fields of a whole 'E' or 'N' frame; null where it is malformed. */
export function readFields(frame: Buffer): readonly Field[] | null {
  const fields: Field[] = []
  let at = 5
  while (at < frame.length && frame[at] !== 0) {
    const end = frame.indexOf(0, at + 1)
    if (end < 0) return null
    fields.push([String.fromCharCode(frame.readUInt8(at)), frame.toString('latin1', at + 1, end)])
    at = end + 1
  }
  return at === frame.length - 1 ? fields : null
}

/** A whole frame of type 'E' or 'N'. */
export function fieldsFrame(type: 'E' | 'N', fields: readonly Field[]): Buffer {
  const body = `${fields.map(([letter, value]) => `${letter}${value}\0`).join('')}\0`
  const frame = Buffer.allocUnsafe(5 + body.length)
  frame.write(type, 0, 'latin1')
  frame.writeInt32BE(4 + body.length, 1)
  frame.write(body, 5, 'latin1')
  return frame
}

/** An ErrorResponse frame; `encode` turns text into the client's encoding, UTF-8 unless given. */
export function complaintFrame(complaint: Complaint, encode: (text: string) => Buffer = utf8): Buffer {
  const { severity, sqlstate, message, detail = '', hint = '', position = 0 } = complaint
  const text = (value: string) => encode(value.replaceAll('\0', '')).toString('latin1')
  const fields: Field[] = [
    ['S', severity],
    ['V', severity],
    ['C', sqlstate],
    ['M', text(message)],
  ]
  if (detail !== '') fields.push(['D', text(detail)])
  if (hint !== '') fields.push(['H', text(hint)])
  if (position > 0) fields.push(['P', String(position)])
  return fieldsFrame('E', fields)
}

function utf8(text: string): Buffer {
  return Buffer.from(text, 'utf8')
}
