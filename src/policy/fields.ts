import { z } from 'zod'
import { readDecimal } from './decimal.ts'
import { nameParts, wordComplaint } from './names.ts'
import { isVerifier } from './verifier.ts'

/**
 * What the fields of a policy are made of. `remedy` is what a complaint about the field ends in; `json` stands for the field in the JSON Schema,
 * since amounts are texts to the reader and numbers to whoever writes them.
 */
declare module 'zod' {
  interface GlobalMeta {
    remedy?: string
    /** The value is not repeated in complaints. */
    secret?: boolean
    json?: Readonly<Record<string, unknown>>
  }
}

/** A number of any size, kept as it was written. */
export const amount = z.string().refine((text) => readDecimal(text) !== null, 'is not a plain decimal number')

export const epsilon = amount
  .refine((text) => (readDecimal(text)?.units ?? 1n) > 0n, 'must be greater than 0')
  .meta({
    description: 'Privacy loss: any number above 0; small is strict.',
    remedy: 'write a number above 0, such as 0.1',
    json: { type: 'number', exclusiveMinimum: 0 },
  })

export const delta = amount
  .refine((text) => {
    const value = readDecimal(text)
    return value === null || (value.units >= 0n && 2n * value.units < 10n ** BigInt(value.scale))
  }, 'must be 0 or more and less than 0.5')
  .meta({
    description: 'The probability with which the bound may fail: 0 or more, far less than 0.5.',
    remedy: 'write a number such as 1e-8, or 0',
    json: { type: 'number', minimum: 0, exclusiveMaximum: 0.5 },
  })

/** A literal of a column's type: checked against the column by the fit. */
export const literal = z
  .string()
  .max(4096, 'is longer than 4096 characters')
  .meta({ remedy: 'write one plain value', json: { type: ['string', 'number', 'boolean'] } })

export const step = amount
  .refine((text) => (readDecimal(text)?.units ?? 1n) > 0n, 'must be greater than 0')
  .meta({
    description: 'The grid that values are put on.',
    remedy: 'write a number above 0, such as step: 1 or step: 0.5',
    json: { type: 'number', exclusiveMinimum: 0 },
  })

export const boundCeiling = 1_000_000

export const bound = z
  .string()
  .regex(/^[1-9]\d{0,6}$/, `is not a whole number from 1 to ${boundCeiling}`)
  .refine((text) => !/^\d{1,7}$/.test(text) || Number(text) <= boundCeiling, `is not a whole number from 1 to ${boundCeiling}`)
  .meta({
    remedy: 'write bounds: { groups: 12, rows: 20 } with numbers that most persons stay below',
    json: { type: 'integer', minimum: 1, maximum: boundCeiling },
  })

export const word = z
  .string()
  .superRefine((text, context) => {
    const complaint = wordComplaint(text)
    if (complaint !== null) context.addIssue({ code: 'custom', message: complaint })
  })
  .meta({ remedy: 'choose a word such as ferries', json: { type: 'string', pattern: '^[a-z][a-z0-9_]{0,62}$' } })

const namePart = (least: number, most: number, what: string, remedy: string) =>
  z
    .string()
    .refine((text) => {
      const parts = nameParts(text)
      return parts !== null && parts.length >= least && parts.length <= most
    }, `is not ${what}`)
    .meta({ remedy })

export const schemaName = namePart(1, 1, 'the name of a schema', 'write schema: public')
export const tableName = namePart(1, 2, 'the name of a table', 'write the name as the database spells it: trips, or schema.trips')
export const columnName = namePart(1, 1, 'the name of a column', 'write the name as the database spells it: rider_id')
export const columnReference = namePart(2, 3, 'the name of a column with its table', 'write table.column, such as trips.trip_id')

export const called = z
  .string()
  .regex(/^\p{L}[\p{L} _-]{0,62}$/u, 'is not a word')
  .meta({ description: 'What a person of this data set is called in messages.', remedy: 'write a word such as rider' })

export const duration = z
  .string()
  .regex(/^\d{1,5}(\.\d{1,3})?(ms|s)$/, 'is not a length of time')
  .refine((text) => !/^\d{1,5}(\.\d{1,3})?(ms|s)$/.test(text) || withinMinute(text), 'must lie between 1ms and 60s')
  .meta({ description: 'When a plain statement is answered: neither earlier nor, as a rule, later.', remedy: 'write a length of time such as 0.3s or 300ms' })

/** `0.3s` or `300ms` in milliseconds. */
export function milliseconds(text: string): number {
  const value = Number.parseFloat(text)
  return Math.round(text.endsWith('ms') ? value : value * 1000)
}

function withinMinute(text: string): boolean {
  const value = milliseconds(text)
  return value >= 1 && value <= 60_000
}

/** YAML's `true`. */
export const yes = z.literal('true', 'can only be true').meta({ remedy: 'write published: true, or leave it out', json: { const: true } })

export const verifier = z
  .string()
  .refine(isVerifier, 'is not a SCRAM-SHA-256 verifier')
  .nullable()
  .meta({
    description: 'A PostgreSQL SCRAM-SHA-256 verifier; `hedgerow password NAME` writes it.',
    secret: true,
    remedy: 'remove it and run: hedgerow password NAME',
    json: { type: ['string', 'null'], pattern: '^SCRAM-SHA-256\\$' },
  })

export const renews = z.enum(['never', 'month', 'quarter', 'year'], 'is not a renewal period').meta({ remedy: 'write one of never, month, quarter, year' })
