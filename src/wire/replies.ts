import { complaintFrame, fieldsFrame, readFields, type Field } from './error-frame.ts'
import type { Pipeline } from './pipeline.ts'
import { codecOf } from './text-encoding.ts'

const oursInContext = /\bhedgerow\.\w+\(/

/**
 * What the client gets for an ErrorResponse or NoticeResponse of the lobby: the refusal where the error stands for one; the error without its
 * context where that names functions of Hedgerow; without its position where that counts characters of a rewritten text; the same buffer otherwise.
 */
export function reworded(frame: Buffer, pipeline: Pipeline, clientEncoding: string): Buffer {
  const fields = readFields(frame)
  if (fields === null) return frame
  const type = frame[0] === 0x45 ? 'E' : 'N'
  const field = (letter: string) => fields.find(([name]) => name === letter)?.[1] ?? ''
  if (type === 'E' && field('C') === '42883') {
    const refusal = pipeline.refusalIn(field('M'))
    if (refusal !== null) return complaintFrame({ severity: 'ERROR', ...refusal }, (text) => codecOf(clientEncoding).encode(text))
  }
  if (oursInContext.test(field('W'))) return without(type, fields, 'WPpq')
  if (field('P') !== '' && pipeline.positionIsOurs) return without(type, fields, 'P')
  return frame
}

function without(type: 'E' | 'N', fields: readonly Field[], letters: string): Buffer {
  return fieldsFrame(
    type,
    fields.filter(([letter]) => !letters.includes(letter)),
  )
}
