import pg from 'pg'
import { check } from '../../src/base/check.ts'
import type { Case, Parameter } from './case-file.ts'

/** What one statement gave: its columns with their type oids, its rows as text, its command tag, what COPY sent. */
export interface Outcome {
  readonly columns: readonly { readonly name: string; readonly type: number }[]
  readonly rows: readonly (readonly (string | null)[])[]
  readonly command: string
  readonly copied: string
}

interface Complaint {
  readonly code: string
  readonly message: string
  readonly hint: string
}

const asText = { getTypeParser: () => (value: string) => value } as unknown as pg.CustomTypesConfig

/** A session whose values come as PostgreSQL sent them. */
export async function session(url: string): Promise<pg.Client> {
  const client = new pg.Client({ connectionString: url, types: asText })
  client.on('error', () => undefined)
  await client.connect()
  return client
}

/** Runs one statement in the case's way: parameters where it names any, binary where the case says so. */
export async function runStatement(client: pg.Client, text: string, each: Case): Promise<Outcome> {
  const copied: Buffer[] = []
  const connection = (client as unknown as { readonly connection: NodeJS.EventEmitter }).connection
  const hear = (message: { readonly chunk: Buffer }): void => void copied.push(message.chunk)
  connection.on('copyData', hear)
  try {
    const used = each.parameters.filter((_, i) => new RegExp(`\\$${String(i + 1)}\\b`).test(text))
    const values = used.map((parameter) => (each.binary ? binaryOf(parameter) : parameter.value))
    const binary = each.binary ? { binary: true } : {}
    const result = (await client.query({ text, rowMode: 'array', ...(values.length > 0 ? { values } : {}), ...binary })) as pg.QueryArrayResult<
      (string | null)[]
    >
    return {
      columns: result.fields.map((field) => ({ name: field.name, type: field.dataTypeID })),
      rows: result.rows,
      command: result.command,
      copied: Buffer.concat(copied).toString('utf8'),
    }
  } finally {
    connection.off('copyData', hear)
  }
}

/** The error a statement ends in; its own failure where it ends in none. */
export async function complaintOf(work: Promise<unknown>): Promise<Complaint> {
  try {
    await work
  } catch (problem) {
    check(problem instanceof pg.DatabaseError, `a refusal is an error of the protocol, not ${String(problem)}`)
    return { code: problem.code ?? '', message: problem.message, hint: problem.hint ?? '' }
  }
  throw new Error('the statement was answered')
}

/** The binary form of a parameter. */
function binaryOf(parameter: Parameter): Buffer | null {
  const { type, value } = parameter
  if (value === null) return null
  switch (type) {
    case 'int4': {
      const bytes = Buffer.alloc(4)
      bytes.writeInt32BE(Number(value))
      return bytes
    }
    case 'int8': {
      const bytes = Buffer.alloc(8)
      bytes.writeBigInt64BE(BigInt(value))
      return bytes
    }
    case 'bool':
      return Buffer.from([value === 'true' ? 1 : 0])
    case 'text':
      return Buffer.from(value, 'utf8')
    case 'date': {
      const bytes = Buffer.alloc(4)
      bytes.writeInt32BE((Date.parse(`${value}T00:00:00Z`) - Date.UTC(2000, 0, 1)) / 86_400_000)
      return bytes
    }
    case 'timestamptz': {
      const bytes = Buffer.alloc(8)
      bytes.writeBigInt64BE(BigInt(Date.parse(value) - Date.UTC(2000, 0, 1)) * 1000n)
      return bytes
    }
    default:
      throw new Error(`no binary form of ${type} here`)
  }
}

/** The SQL that a hint holds: from its first command word to its end, or to the words that go on in prose. */
export function sqlInHint(hint: string): string | null {
  const [, sql = ''] = /(?:: |example |^)((?:SELECT|WITH|SET|CREATE TEMP TABLE) .*)$/s.exec(hint) ?? []
  return sql === '' || sql.includes('…') ? null : sql
}
