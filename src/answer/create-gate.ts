import { completed, Refusal, refuse } from '../base/refusal.ts'
import { type CutBlock, cutStatement } from '../plan/cut.ts'
import { noLimits } from '../plan/limits.ts'
import { planBlock } from '../plan/block.ts'
import { type BlockTypes, explainText, openText, refusedText, rewritten } from '../plan/rewrite.ts'
import { exampleFor, exampleOf } from '../plan/example.ts'
import type { DataSet } from '../policy/data-set.ts'
import { printStatement } from '../sql/print.ts'
import type { Parser, ReadStatement } from '../sql/parser.ts'
import type { Describer } from './block-types.ts'
import { privateTables, refuseClosed } from './closed-statements.ts'
import { dataSetOf, type InForce } from './in-force.ts'
import type { Gate, GateRefusal, GateRequest, GateVerdict } from './ports.ts'
import { mentionTest } from './private-names.ts'

export interface GateParts {
  readonly parser: Parser
  readonly describer: Describer
  inForce(): InForce
  /** A fresh marker for a refused statement. */
  marker(): string
}

type Mention = (text: Uint8Array) => boolean

/** Any instant: before a statement runs, now() is unknown and decides nothing. */
const someInstant = '2000-01-01T00:00:00+00:00'

const analysed: ReadonlySet<string> = new Set(['query', 'select-into', 'create-table-as', 'insert'])

/** What the wire asks of each text that may name a private table. */
export function createGate(parts: GateParts): Gate {
  const tests = new WeakMap<DataSet, Mention>()
  const testOf = (dataSet: DataSet): Mention => {
    const known = tests.get(dataSet)
    if (known !== undefined) return known
    const made = mentionTest(dataSet)
    tests.set(dataSet, made)
    return made
  }
  return {
    admits: (user, database) => parts.inForce().policies.analysts.get(user)?.data.has(database) ?? false,
    mentions: (database, text) => {
      const dataSet = dataSetOf(parts.inForce(), database)
      return dataSet !== null && testOf(dataSet)(text)
    },
    judge: async (request) => {
      const dataSet = dataSetOf(parts.inForce(), request.database)
      return dataSet === null ? { kind: 'untouched' } : judge(request, dataSet, testOf(dataSet), parts)
    },
  }
}

async function judge(request: GateRequest, dataSet: DataSet, mentions: Mention, parts: GateParts): Promise<GateVerdict> {
  const refusals: { readonly marker: string; readonly refusal: GateRefusal }[] = []
  const refused = (refusal: Refusal): string => {
    const marker = parts.marker()
    refusals.push({
      marker,
      refusal: { sqlstate: refusal.sqlstate, message: refusal.message, hint: refusal.hint, position: positionOf(request.text, refusal.at) },
    })
    return refusedText(marker)
  }
  let outcome
  try {
    outcome = await parts.parser.readText(request.text)
  } catch (problem) {
    if (!(problem instanceof Refusal)) throw problem
    return { kind: 'rewritten', text: refused(problem), refusals }
  }
  if (outcome.kind === 'syntax-error') return { kind: 'untouched' }
  if (!request.standardConformingStrings && /\\|U&'/i.test(request.text) && outcome.statements.some((placed) => privateTables(placed, dataSet).length > 0))
    return { kind: 'rewritten', text: refused(new Refusal('text.backslash', {}, -1)), refusals }
  const bytes = Buffer.from(request.text, 'utf8')
  const pieces: string[] = []
  let at = 0
  for (const placed of outcome.statements) {
    const slice = bytes.subarray(placed.start, placed.start + placed.length)
    const replaced = await judgeStatement(placed, slice, request, dataSet, mentions, parts, refused)
    if (replaced === null) continue
    pieces.push(bytes.subarray(at, placed.start).toString('utf8'), ' ', replaced, ' ')
    at = placed.start + placed.length
  }
  if (pieces.length === 0) return { kind: 'untouched' }
  pieces.push(bytes.subarray(at).toString('utf8'))
  return { kind: 'rewritten', text: pieces.join(''), refusals }
}

/** The text to put in a statement's place, or null where it goes on as it is. */
async function judgeStatement(
  placed: ReadStatement,
  slice: Buffer,
  request: GateRequest,
  dataSet: DataSet,
  mentions: Mention,
  parts: GateParts,
  refused: (refusal: Refusal) => string,
): Promise<string | null> {
  const tables = privateTables(placed, dataSet)
  try {
    refuseClosed(placed, tables, mentions(slice), dataSet)
    if (tables.length === 0) return null
    if (placed.refusal !== null) return refuse(placed.refusal.code, placed.refusal.facts, placed.refusal.at)
    if (placed.statement.kind === 'other') return null
    return await rewrite(placed, slice.toString('utf8'), request, dataSet, parts)
  } catch (problem) {
    if (!(problem instanceof Refusal)) throw problem
    // what PostgreSQL itself would complain about, it says better, and with its caret
    const text = slice.toString('utf8')
    if (placed.statement.kind === 'query' && (await parts.describer.complaint(dataSet, text, request.parameterTypes))) return null
    const [table] = tables
    return refused(completed(problem, { example: table === undefined ? exampleFor(dataSet, null) : exampleOf(dataSet, table), person: dataSet.personCalled }))
  }
}

async function rewrite(placed: ReadStatement, text: string, request: GateRequest, dataSet: DataSet, parts: GateParts): Promise<string | null> {
  const { statement } = placed
  const cut = cutStatement(statement, dataSet)
  const types: BlockTypes[] = []
  for (const block of cut.blocks) {
    const oids = block.parameters.map((number) => request.parameterTypes[number - 1] ?? 0)
    const description = await parts.describer.block(dataSet, openText(block), oids)
    if (description.kind === 'complaint') {
      // other commands are analysed when they run: PostgreSQL says then what is wrong
      if (!analysed.has(statement.kind) || (await parts.describer.complaint(dataSet, text, request.parameterTypes))) return null
      return refuseCorrelated(block, description.message, dataSet)
    }
    const parameters = description.parameters.map((type) => ({ type, value: undefined }))
    planBlock(block.query, { dataSet, parameters, now: someInstant, timeZone: 'UTC', commonTables: new Map(), scans: [] }, noLimits)
    types.push(description.types)
  }
  if (statement.kind === 'explain' && cut.blocks.length > 0) {
    const whole = await parts.describer.block(dataSet, printStatement(statement.statement), request.parameterTypes)
    return explainText(text, whole.kind === 'described' ? whole.types.parameters : [])
  }
  return rewritten(cut, types)
}

/** A block that PostgreSQL understands within its statement only: it reads columns of the query around it. */
function refuseCorrelated(block: CutBlock, complaint: string, dataSet: DataSet): never {
  const column = /"([^"]+)"|column (\S+)/.exec(complaint)
  return refuse('block.correlated', { column: column?.[1] ?? column?.[2] ?? 'a column', example: exampleFor(dataSet, block.query) })
}

/** A byte offset as the character, from 1, that PostgreSQL's position field counts; 0 for no place. */
function positionOf(text: string, at: number): number {
  if (at < 0) return 0
  return [...Buffer.from(text, 'utf8').subarray(0, at).toString('utf8')].length + 1
}
