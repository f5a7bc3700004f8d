import { Failure } from '../base/failure.ts'
import type { Log } from '../base/ports.ts'
import type { Gate, GateRefusal } from '../answer/ports.ts'
import { parameterTypes, readStatement, withText, type StatementFrame } from './messages.ts'
import type { SessionFacts } from './session-facts.ts'
import { codecOf, isSpoken } from './text-encoding.ts'

/** The frame that goes to the lobby in the place of a Query or Parse. */
export interface Judged {
  readonly bytes: Buffer
  readonly rewritten: boolean
  readonly refusals: readonly { readonly marker: string; readonly refusal: GateRefusal }[]
}

let refusalsOfOurs = 0

/**
 * Asks the gate about a Query or Parse frame. Most texts mention nothing private: then the answer is there at once, and it is the very frame.
 * What cannot be read as text goes on as it is, since PostgreSQL turns it away in its own words.
 */
export function judge(bytes: Buffer, facts: SessionFacts, gate: Gate, log: Log): Judged | Promise<Judged> {
  const untouched: Judged = { bytes, rewritten: false, refusals: [] }
  const statement = readStatement(bytes)
  if (statement === null || !gate.mentions(facts.database, statement.text)) return untouched
  const text = codecOf(facts.clientEncoding).decode(statement.text)
  if (text === null) return isSpoken(facts.clientEncoding) ? untouched : refused(statement, unspoken(facts.clientEncoding))
  return judgeText(statement, text, facts, gate, log, untouched)
}

async function judgeText(statement: StatementFrame, text: string, facts: SessionFacts, gate: Gate, log: Log, untouched: Judged): Promise<Judged> {
  try {
    const verdict = await gate.judge({
      user: facts.user,
      database: facts.database,
      text,
      parameterTypes: parameterTypes(statement),
      standardConformingStrings: facts.standardConformingStrings,
    })
    if (verdict.kind === 'untouched') return untouched
    return { bytes: withText(statement, codecOf(facts.clientEncoding).encode(verdict.text)), rewritten: true, refusals: verdict.refusals }
  } catch (error) {
    const failure = error instanceof Failure ? error : new Failure('internal')
    log('error', 'wire.gate_failed', {
      user: facts.user,
      database: facts.database,
      reference: failure.reference,
      fault: error instanceof Error ? error.name : 'unknown',
    })
    return refused(statement, {
      sqlstate: 'XX000',
      message: `the statement could not be judged (reference ${failure.reference})`,
      hint: 'Tell whoever runs Hedgerow the reference.',
      position: 0,
    })
  }
}

/** A text that fails in the lobby's analysis, so that the transaction takes the refusal as it takes any error. */
function refused(statement: StatementFrame, refusal: GateRefusal): Judged {
  refusalsOfOurs += 1
  const marker = `refused_by_wire_${refusalsOfOurs}_`
  return { bytes: withText(statement, Buffer.from(`SELECT hedgerow.${marker}()`)), rewritten: true, refusals: [{ marker, refusal }] }
}

function unspoken(clientEncoding: string): GateRefusal {
  return {
    sqlstate: '22021',
    message: `a statement over private tables cannot be read in ${clientEncoding}`,
    hint: "Write it in ASCII, or SET client_encoding = 'UTF8'.",
    position: 0,
  }
}
