import type { Random } from './random.ts'
import type { FuzzColumn } from './worlds.ts'

/** A column in sight of an expression. */
export interface Seen extends FuzzColumn {
  /** As it is written. */
  readonly sql: string
}

type Family = 'integer' | 'numeric' | 'float' | 'bool' | 'text' | 'date' | 'timestamp' | 'timestamptz' | 'other'

const families: Readonly<Record<string, Family>> = {
  int2: 'integer',
  int4: 'integer',
  int8: 'integer',
  numeric: 'numeric',
  scaled: 'numeric',
  float4: 'float',
  float8: 'float',
  bool: 'bool',
  text: 'text',
  varchar: 'text',
  caseless: 'text',
  bpchar: 'text',
  date: 'date',
  timestamp: 'timestamp',
  timestamptz: 'timestamptz',
}

export const familyOf = (kind: string): Family => families[kind] ?? 'other'

const literals: Readonly<Record<Family, readonly string[]>> = {
  integer: ['0', '1', '2', '3', '5', '-1', '100', '2147483647', '3000000000', "'2'", '9007199254740993'],
  numeric: ['0.5', '1.0', '2.50', '-0.5', '1e3', "'NaN'::numeric", "'1.5'", '1e-3'],
  float: ['0.5::float8', "'NaN'::float8", "'-Infinity'::float8", '0.25', '1', '1e300', '1e-300', '1e400', "'-0'::float8"],
  bool: ['true', 'false', 'NULL'],
  text: ["'a'", "'b'", "''", "' '", "'fog'", "'it''s'", "'%'", "E'back\\\\slash'", "'x  '"],
  date: ["'2025-06-01'", "date '2026-01-01'", "'infinity'::date", "'5874897-12-31'::date", "'4713-11-24 BC'::date"],
  timestamp: ["'2025-06-01'", "timestamp '2025-03-30 02:30'", "'-infinity'::timestamp", "'294276-12-31'::timestamp"],
  timestamptz: ["'2025-06-01'", "timestamptz '2025-10-26 00:30+00'", "'infinity'::timestamptz", 'now()', 'current_date'],
  other: ["'fog'", 'NULL'],
}

/** Writes expressions over the columns in sight, from everything that the planner may accept; some it will refuse. */
export class Expressions {
  readonly #columns: readonly Seen[]
  readonly #random: Random

  constructor(columns: readonly Seen[], random: Random) {
    this.#columns = columns
    this.#random = random
  }

  column(test: (column: Seen) => boolean): string | null {
    const found = this.#columns.filter(test)
    return found.length === 0 ? null : this.#random.pick(found).sql
  }

  #of(family: Family, clamped = false): string {
    const found = this.column((each) => familyOf(each.kind) === family && (!clamped || each.clamped))
    return found !== null && this.#random.chance(0.8) ? found : this.#literal(family)
  }

  #literal(family: Family): string {
    return this.#random.pick(literals[family])
  }

  /** A number that the planner can bound. */
  number(depth: number): string {
    const random = this.#random
    const sub = (): string => this.number(depth - 1)
    if (depth <= 0 || random.chance(0.25)) {
      return this.column((each) => each.clamped && ['integer', 'numeric', 'float'].includes(familyOf(each.kind))) ?? '1'
    }
    switch (random.below(18)) {
      case 0:
        return `(${sub()} + ${sub()})`
      case 1:
        return `(${sub()} - ${random.chance(0.5) ? sub() : '2'})`
      case 2:
        return `(${sub()} * ${random.chance(0.5) ? sub() : '0.25'})`
      case 3:
        return `(${sub()} / ${this.#divisor()})`
      case 4:
        return `(${this.#of('integer', true)} % ${random.chance(0.5) ? '3' : this.#of('integer', true)})`
      case 5:
        return `(- ${sub()})`
      case 6:
        return `abs(${sub()})`
      case 7:
        return `${random.pick(['floor', 'ceil', 'round', 'trunc', 'sign', 'ceiling'])}(${sub()})`
      case 8:
        return `round(${random.pick(['round', 'trunc']) === 'round' ? sub() : this.#of('numeric', true)}, ${random.below(4).toString()})`
      case 9:
        return `CASE WHEN ${this.bool(depth - 1)} THEN ${sub()} ${random.chance(0.6) ? `ELSE ${sub()} ` : ''}END`
      case 10:
        return `coalesce(${sub()}, ${random.pick(['0', sub()])})`
      case 11:
        return `${random.pick(['greatest', 'least'])}(${sub()}, ${sub()})`
      case 12:
        return `nullif(${sub()}, ${random.pick(['0', '1', sub()])})`
      case 13:
        return `(${sub()})::${random.pick(['int', 'bigint', 'numeric', 'float8', 'int2'])}`
      case 14:
        return `extract(${random.pick(['year', 'month', 'day', 'dow', 'doy', 'week', 'quarter', 'decade', 'isoyear'])} from ${this.instant(depth - 1)})`
      case 15:
        return `date_part('${random.pick(['year', 'month', 'hour', 'isodow'])}', ${this.instant(depth - 1, ['timestamp', 'timestamptz'])})`
      case 16:
        return `(${this.instant(depth - 1, ['date'])} - ${this.instant(depth - 1, ['date'])})`
      default:
        return `(${this.bool(0)})::int`
    }
  }

  #divisor(): string {
    const random = this.#random
    return random.pick([
      '2',
      '0.5',
      '3',
      this.#of('integer', true),
      `(${this.#of('integer', true)} + 1)`,
      this.#of('numeric', true),
      `nullif(${this.#of('integer', true)}, 1)`,
    ])
  }

  /** A date or time within clamps. */
  instant(depth: number, only: readonly Family[] = ['date', 'timestamp', 'timestamptz']): string {
    const random = this.#random
    const family = random.pick(only)
    const plain = this.column((each) => familyOf(each.kind) === family && each.clamped) ?? `${family} '2025-06-01'`
    if (depth <= 0 || random.chance(0.5)) return plain
    const other = this.column((each) => familyOf(each.kind) === family && each.clamped) ?? plain
    switch (random.below(7)) {
      case 0:
        return `coalesce(${plain}, ${random.chance(0.5) ? other : this.#literal(family)})`
      case 1:
        return `${random.pick(['greatest', 'least'])}(${plain}, ${random.chance(0.5) ? other : this.#literal(family)})`
      case 2:
        return `CASE WHEN ${this.bool(0)} THEN ${plain} ELSE ${other} END`
      case 3:
        if (family === 'date') return `(${plain} ${random.pick(['+', '-'])} ${random.pick(['1', '30', '100000'])})`
        return `(${plain} ${random.pick(['+', '-'])} interval '${random.pick(['1 month', '1 day', '36 hours', '-1 month'])}')`
      case 4:
        if (family === 'timestamptz') return `date_trunc('${random.pick(['month', 'day', 'week', 'hour', 'year'])}', ${plain})`
        return family === 'timestamp' ? `(${this.column((each) => each.clamped && each.kind === 'timestamptz') ?? plain})::timestamp` : `(${plain})::date`
      case 5:
        return `(${this.instant(depth - 1)})::${family}`
      default:
        return `nullif(${plain}, ${other})`
    }
  }

  text(depth: number): string {
    const random = this.#random
    const sub = (): string => this.text(depth - 1)
    if (depth <= 0 || random.chance(0.35)) return this.#of('text')
    switch (random.below(9)) {
      case 0:
        return `(${sub()} || ${sub()})`
      case 1:
        return `${random.pick(['lower', 'upper', 'btrim', 'ltrim', 'rtrim'])}(${sub()})`
      case 2:
        return `${random.pick(['left', 'right'])}(${sub()}, ${random.pick(['1', '2', '-1', '0', '1000'])})`
      case 3:
        return `substr(${sub()}, ${random.pick(['1', '2', '-3', '0'])}${random.chance(0.5) ? ', 2' : ''})`
      case 4:
      case 5:
        return `(${this.column((each) => each.kind !== 'person') ?? '1'})::text`
      case 6:
        return `CASE WHEN ${this.bool(depth - 1)} THEN ${sub()} ELSE ${sub()} END`
      case 7:
        return `coalesce(${sub()}, 'none')`
      default:
        return `nullif(${sub()}, ${this.#literal('text')})`
    }
  }

  /** Two sides that may be compared. */
  #pair(depth: number): readonly [string, string] {
    const random = this.#random
    const numbers: readonly Family[] = ['integer', 'numeric', 'float']
    switch (random.below(7)) {
      case 0:
      case 1: {
        const [a, b] = [random.pick(numbers), random.chance(0.6) ? null : random.pick(numbers)]
        return [this.#of(a), this.#of(b ?? a)]
      }
      case 2:
        return [this.number(depth), random.chance(0.5) ? this.#literal(random.pick(numbers)) : this.#of('float')]
      case 3:
      case 4:
        return [this.text(depth), random.chance(0.6) ? this.#literal('text') : this.text(depth)]
      case 5: {
        const instants: readonly Family[] = ['date', 'timestamp', 'timestamptz']
        return [this.#of(random.pick(instants)), this.#of(random.pick(instants))]
      }
      default:
        return [this.instant(depth), this.#of(random.pick(['date', 'timestamp', 'timestamptz']))]
    }
  }

  bool(depth: number): string {
    const random = this.#random
    if (depth > 0 && random.chance(0.3)) {
      const [a, b] = [this.bool(depth - 1), this.bool(depth - 1)]
      return random.pick([
        `(${a} AND ${b})`,
        `(${a} OR ${b})`,
        `NOT (${a})`,
        `(${a}) IS ${random.pick(['TRUE', 'NOT TRUE', 'FALSE', 'UNKNOWN', 'NOT UNKNOWN'])}`,
      ])
    }
    const [a, b] = this.#pair(depth)
    switch (random.below(12)) {
      case 0:
      case 1:
      case 2:
        return `${a} ${random.pick(['=', '<>', '<', '<=', '>', '>=', '!='])} ${b}`
      case 3:
        return `${a} IS ${random.pick(['NOT ', ''])}DISTINCT FROM ${b}`
      case 4:
        return `${a} ${random.pick(['NOT ', ''])}BETWEEN ${b} AND ${b}`
      case 5:
        return `${a} ${random.pick(['NOT ', ''])}IN (${b}, ${random.pick([b, a, 'NULL'])})`
      case 6:
        return `${a} = ANY (ARRAY[${b}, ${b}])`
      case 7:
        return `${this.column(() => true) ?? '1'} IS ${random.pick(['NOT ', ''])}NULL`
      case 8:
        return `${this.text(1)} ${random.pick(['NOT ', ''])}${random.pick(['LIKE', 'ILIKE'])} ${random.pick(["'a%'", "'%_'", "'%\\%%'", "''", "'_'"])}`
      case 9:
        return this.#of('bool')
      case 10:
        return `${this.column((each) => each.kind === 'sky') ?? 'NULL'} = 'fog'`
      default:
        return `${this.number(depth)} ${random.pick(['>', '<=', '='])} ${random.pick(['0', '1', '2', '0.5'])}`
    }
  }

  /** A group key. */
  key(): string {
    const random = this.#random
    const plain = this.column((each) => !['person', 'serial', 'reference', 'interval'].includes(each.kind)) ?? 'true'
    switch (random.below(9)) {
      case 0:
        return `date_trunc('${random.pick(['month', 'quarter', 'year', 'week'])}', ${this.instant(1)})`
      case 1:
        return `extract(${random.pick(['month', 'dow', 'year', 'quarter'])} from ${this.instant(1)})`
      case 2:
        return `CASE WHEN ${this.bool(1)} THEN 'yes' ELSE 'no' END`
      case 3:
        return `coalesce(${this.text(0)}, 'none')`
      case 4:
        return random.chance(0.5) ? this.number(2) : this.text(2)
      case 5:
        return `(${this.bool(0)})`
      default:
        return plain
    }
  }
}
