import { z } from 'zod'
import {
  bound,
  called,
  columnName,
  columnReference,
  delta,
  duration,
  epsilon,
  literal,
  renews,
  schemaName,
  step,
  tableName,
  verifier,
  word,
  yes,
} from './fields.ts'

/** The two kinds of policy file, as they are written. What the catalogue must agree to is checked by the fit. */

/** Unions of two forms: which one a written value means, so that complaints speak of that form alone. */
export const choices = new WeakMap<object, (value: unknown) => number>()

const pair = z
  .array(literal)
  .refine((ends) => ends.length === 2, 'is not a list of two values, the least and the greatest')
  .meta({
    description: 'Values outside are moved to the nearer end.',
    remedy: 'write clamp: [0, 2500]',
    json: { type: 'array', items: { type: ['string', 'number'] }, minItems: 2, maxItems: 2 },
  })

const column = z
  .strictObject({
    clamp: pair.optional(),
    step: step.optional(),
    values: z
      .array(literal)
      .refine((list) => list.length > 0, 'lists no value')
      .meta({
        description: 'Every value that may be shown as a group, whether or not it occurs.',
        remedy: 'write values: [Northbank, Eastquay]',
        json: { type: 'array', items: { type: ['string', 'number', 'boolean'] }, minItems: 1 },
      })
      .optional(),
    values_from: columnReference
      .meta({ description: 'A column of a published table that lists the values.', remedy: 'write values_from: piers.pier_id' })
      .optional(),
    also_identifies: z
      .literal('accepted', 'can only be accepted')
      .meta({
        description: 'The column refers to a second person, who is not protected by this row.',
        remedy: 'write also_identifies: accepted, or leave the column out',
      })
      .optional(),
  })
  .meta({ remedy: 'write a mapping, such as { clamp: [0, 120], step: 0.5 }, or {} for a column without declarations' })

const owner = z.union([columnName, z.strictObject({ through: columnReference, by: columnName })]).meta({
  description: 'Whose row it is: a column, or the way to the table that knows.',
  remedy: 'write person: rider_id, or person: { through: trips.trip_id, by: trip_id }',
})
choices.set(owner, (value) => (typeof value === 'string' ? 0 : 1))

const published = z.strictObject({ published: yes }).meta({
  description: 'Open to every analyst in full: nothing in it is about a person.',
  remedy: 'write { published: true } alone: a published table is open in full',
})

const owned = z
  .strictObject({
    person: owner,
    bounds: z
      .strictObject({ groups: bound.optional(), rows: bound.optional() })
      .meta({ description: 'Groups a person may touch, and rows of a person in each.', remedy: 'write bounds: { groups: 12, rows: 20 }' })
      .optional(),
    columns: z
      .record(columnName, column.nullable())
      .meta({ description: 'The open columns: what is not listed is closed.', remedy: 'write columns: { topic: {} }' })
      .optional(),
  })
  .meta({ remedy: 'write a mapping with person, bounds and columns, or { published: true }' })

const table = z.union([published, owned]).meta({ remedy: 'write a mapping with person, bounds and columns, or { published: true }' })
choices.set(table, (value) => (typeof value === 'object' && value !== null && 'published' in value ? 0 : 1))

/** A data set: whose privacy is kept, which tables are open, how much one person may count. */
export const dataSetFile = z
  .strictObject({
    dataset: word.meta({
      description: 'The database name that analysts connect to.',
      remedy: 'write a lower-case word, such as dataset: ferries',
      json: { type: 'string', pattern: '^[a-z][a-z0-9_]{0,62}$' },
    }),
    schema: schemaName
      .meta({ description: 'Where the tables are, unless a name says otherwise; public where left out.', remedy: 'write schema: public' })
      .optional(),
    person: z
      .strictObject({ called, key: columnReference.meta({ remedy: 'write the column that is unique for each person, such as key: riders.rider_id' }) })
      .meta({ remedy: 'write person: { called: rider, key: riders.rider_id }' }),
    defaults: z
      .strictObject({ epsilon: epsilon.optional(), delta: delta.optional() })
      .meta({ description: 'What a statement spends unless it says otherwise.', remedy: 'write defaults: { epsilon: 0.1, delta: 1e-8 }' })
      .optional(),
    reply_after: duration.optional(),
    tables: z
      .record(tableName, table)
      .refine((tables) => Object.keys(tables).length > 0, 'lists no table')
      .meta({ description: 'The open tables: what is not listed is closed.', remedy: 'write at least one table with person, bounds and columns' }),
  })
  .meta({ title: 'A Hedgerow data set', remedy: 'write a mapping with dataset, person and tables' })

const cap = z
  .strictObject({ epsilon, delta, renews: renews.optional() })
  .meta({ description: 'The most that may ever be lost, or lost in each period.', remedy: 'write { epsilon: 4, delta: 1e-6, renews: never }' })

const caps = z.record(word, cap).meta({ remedy: 'write ferries: { epsilon: 4, delta: 1e-6 }' })

const analyst = z.strictObject({ login: verifier.optional(), data: caps.optional() }).meta({ remedy: 'write a mapping with login and data' })

/** Who may ask, and how much may be lost to each and to all. */
export const analystsFile = z
  .strictObject({
    analysts: z
      .record(word.meta({ remedy: 'choose a lower-case word, such as ana', json: { type: 'string', pattern: '^[a-z][a-z0-9_]{0,62}$' } }), analyst)
      .meta({ remedy: 'write analysts: { ana: { data: { ferries: { epsilon: 4, delta: 1e-6 } } } }' }),
    everyone: caps.meta({
      description: 'The cap over all analysts together, for each data set.',
      remedy: 'write everyone: { ferries: { epsilon: 12, delta: 1e-5 } }',
    }),
  })
  .meta({ title: 'The analysts of a Hedgerow', remedy: 'write a mapping with analysts and everyone' })

export type DataSetFile = z.output<typeof dataSetFile>
export type AnalystsFile = z.output<typeof analystsFile>
export type ColumnFile = z.output<typeof column>
export type CapFile = z.output<typeof cap>
export type OwnedTableFile = z.output<typeof owned>
