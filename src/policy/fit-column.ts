import type { CatalogColumn, CatalogType } from '../catalog/catalog.ts'
import type { Findings, Place } from './complaint.ts'
import type { DataColumn } from './data-set.ts'
import { compareDecimals, isMultiple, isWhole, multiplesAround, printDecimal, readDecimal } from './decimal.ts'
import type { Decimal } from './decimal.ts'
import { readLiteral } from './literal.ts'
import type { Literal } from './literal.ts'
import { didYouMean } from './near.ts'
import { columnReference } from './names.ts'
import type { Schemed } from './fit-tables.ts'
import type { ColumnFile } from './schema.ts'
import { isNumber, isOrdered, isUsable, numericShape } from './type.ts'
import type { Path } from './yaml-text.ts'

/** What a column's declarations are held against. */
export interface ColumnContext {
  readonly findings: Findings
  readonly place: (path: Path) => Place
  readonly keyPlace: (path: Path) => Place
  readonly path: Path
  readonly label: string
  readonly tables: Schemed
}

/** A column without declarations: published, linking, or listed bare. */
export function plainColumn(column: CatalogColumn, role: DataColumn['role']): DataColumn {
  return {
    name: column.name,
    type: column.type,
    notNull: column.notNull,
    deterministic: column.deterministic,
    collation: column.collation ?? null,
    role,
    clamp: null,
    step: null,
    values: null,
    valuesFrom: null,
  }
}

/** A listed column of a private table with its declarations, as far as they are valid. */
export function fitColumn(context: ColumnContext, column: CatalogColumn, declared: ColumnFile): DataColumn {
  const { findings, place, path, label } = context
  const bare = plainColumn(column, 'listed')
  const written = (['clamp', 'step', 'values', 'values_from'] as const).filter((key) => declared[key] !== undefined)
  const first = written[0]
  if (first === undefined) return { ...bare, step: ownStep(column.type) }
  if (!isUsable(column.type)) {
    findings.complain(
      place([...path, first]),
      `${label} has type ${column.type.printed}, for which nothing can be declared`,
      'list it as {} (its rows can then be counted), or offer a view that casts it to a plain type',
    )
    return bare
  }
  if (declared.values !== undefined && declared.values_from !== undefined)
    findings.complain(context.keyPlace([...path, 'values_from']), `${label} declares both values and values_from`, 'keep one of the two')
  const step = fitStep(context, column.type, declared.step)
  const clamp = fitClamp(context, column.type, declared.clamp, step)
  const values = fitValues(context, column, declared.values, clamp)
  const valuesFrom = fitValuesFrom(context, column.type, declared.values_from)
  return {
    ...bare,
    clamp: clamp === null ? null : [clamp[0].text, clamp[1].text],
    step: step === null ? null : printDecimal(step),
    values,
    valuesFrom,
  }
}

/** Without a declared step the grid is numeric's own scale; other types have none of their own that a policy should fix. */
function ownStep(type: CatalogType): string | null {
  const unit = unitOf(type)
  return unit === null ? null : printDecimal(unit)
}

function unitOf(type: CatalogType): Decimal | null {
  const shape = numericShape(type)
  if (shape === null) return null
  return shape.scale >= 0 ? { units: 1n, scale: shape.scale } : { units: 10n ** BigInt(-shape.scale), scale: 0 }
}

function fitStep(context: ColumnContext, type: CatalogType, written: string | undefined): Decimal | null {
  if (written === undefined) return unitOf(type)
  const place = context.place([...context.path, 'step'])
  const step = readDecimal(written)
  if (!isNumber(type) || step === null) {
    context.findings.complain(place, `${context.label} has type ${type.printed}: only numbers have a step`, 'remove step')
    return null
  }
  if (/^int/.test(type.name) && !isWhole(step)) {
    context.findings.complain(place, `${context.label}: step ${written} is finer than ${type.printed}`, 'write a whole number, such as step: 1')
    return null
  }
  return step
}

function fitClamp(context: ColumnContext, type: CatalogType, written: readonly string[] | undefined, step: Decimal | null): readonly [Literal, Literal] | null {
  if (written === undefined) return null
  const { findings, label } = context
  const path = [...context.path, 'clamp']
  if (!isOrdered(type)) {
    findings.complain(
      context.place(path),
      `${label} has type ${type.printed}, which cannot be clamped`,
      'declare values: […] instead, or {} for a column without declarations',
    )
    return null
  }
  const ends = written.map((text, index) => fitLiteral(context, type, [...path, index], 'clamp', text))
  const [low, high] = ends
  if (!low?.order || !high?.order) return null
  if (compareDecimals(low.order, high.order) >= 0n) {
    findings.complain(context.place(path), `${label}: clamp ${low.text} is not below ${high.text}`, 'write the least value first, then a greater one')
    return null
  }
  let onGrid = true
  for (const [index, end] of [low.order, high.order].entries()) {
    if (step === null || !isNumber(type) || isMultiple(end, step)) continue
    const [below, above] = multiplesAround(end, step)
    onGrid = false
    findings.complain(
      context.place([...path, index]),
      `${label}: clamp ${printDecimal(end)} is no multiple of the step ${printDecimal(step)}`,
      `write ${printDecimal(below)} or ${printDecimal(above)}, or another step`,
    )
  }
  return onGrid ? [low, high] : null
}

function fitValues(
  context: ColumnContext,
  column: CatalogColumn,
  written: readonly string[] | undefined,
  clamp: readonly [Literal, Literal] | null,
): readonly string[] | null {
  if (written === undefined) return null
  const { findings, label } = context
  const path = [...context.path, 'values']
  const seen = new Map<string, string>()
  for (const [index, text] of written.entries()) {
    const literal = fitLiteral(context, column.type, [...path, index], 'values', text)
    if (literal === null) continue
    const twin = seen.get(literal.text)
    if (twin !== undefined)
      findings.complain(context.place([...path, index]), `${label}: values lists ${text} twice${twin === text ? '' : ` (as ${twin})`}`, 'keep one of the two')
    seen.set(literal.text, text)
    const outside =
      literal.order !== null &&
      clamp?.[0].order &&
      clamp[1].order &&
      (compareDecimals(literal.order, clamp[0].order) < 0n || compareDecimals(literal.order, clamp[1].order) > 0n)
    if (outside)
      findings.complain(context.place([...path, index]), `${label}: the value ${text} lies outside the clamp`, 'widen the clamp, or remove the value')
  }
  return [...seen.keys()]
}

function fitLiteral(context: ColumnContext, type: CatalogType, path: Path, key: string, text: string): Literal | null {
  const reading = readLiteral(type, text)
  if (reading.kind === 'literal') return reading.literal
  context.findings.complain(
    context.place(path),
    `${context.label} has type ${type.printed}: ${key} ${text.slice(0, 80)} is not ${reading.expected}`,
    `write a literal of type ${type.printed}`,
  )
  return null
}

function fitValuesFrom(context: ColumnContext, type: CatalogType, reference: string | undefined): DataColumn['valuesFrom'] {
  if (reference === undefined) return null
  const { findings, label, tables } = context
  const place = context.place([...context.path, 'values_from'])
  const source = columnReference(reference, tables.schema)
  const table = tables.catalog.get(source.table)
  if (!tables.published.has(source.table) || table === undefined) {
    findings.complain(
      place,
      `${label}: values_from ${reference} does not name a published table of this policy`,
      didYouMean(source.table, [...tables.published], 'list the table with { published: true }'),
    )
    return null
  }
  const column = table.columns.find((each) => each.name === source.column)
  if (column === undefined) {
    findings.complain(
      place,
      `${label}: values_from ${reference}: the table has no column ${source.column}`,
      didYouMean(
        source.column,
        table.columns.map((each) => each.name),
        'name a column of it',
      ),
    )
    return null
  }
  if (column.type.schema !== type.schema || column.type.name !== type.name) {
    findings.complain(place, `${label} has type ${type.printed}, but ${reference} has type ${column.type.printed}`, 'name a column of the same type')
    return null
  }
  if (!table.uniqueKeys.some((key) => key.length === 1 && key[0] === source.column))
    findings.warn(
      place,
      `${label}: ${reference} is not proved unique and free of NULL`,
      'its distinct values are the list, without NULL; give it a unique index and NOT NULL to be sure of one row each',
    )
  return source
}
