import { call, cast, integer, operator, text } from '../catalog/build.ts'
import type { ScalarType } from '../catalog/scalar-type.ts'
import { scalarTypeOf } from '../catalog/scalar-type.ts'
import { check } from '../base/check.ts'
import type { ReleasePlan } from '../plan/release-plan.ts'
import type { Expr, SortItem } from '../sql/tree.ts'

const hashes: Readonly<Record<string, string>> = {
  int2: 'hashint2extended',
  int4: 'hashint4extended',
  int8: 'hashint8extended',
  text: 'hashtextextended',
  varchar: 'hashtextextended',
  numeric: 'hash_numeric_extended',
  float4: 'hashfloat4extended',
  float8: 'hashfloat8extended',
}

/** A salted 64-bit hash of a value; NULL hashes to NULL. */
function hash(value: Expr, type: ScalarType, salt: bigint): Expr {
  const seed = cast(text(salt.toString()), 'int8')
  const name = hashes[type.name]
  if (name !== undefined) return call(name, [type.name === 'varchar' ? cast(value, 'text') : value, seed])
  return call('hashtextextended', [cast(value, 'text'), seed])
}

/**
 * The order in which a person's groups are kept: by a hash of person and keys under fresh secret salts, then by the keys, so that it is total. It depends
 * on that person's rows and the salts alone.
 */
export function pickOrder(plan: ReleasePlan, salts: readonly bigint[], key: (i: number) => Expr, person: Expr): readonly SortItem[] {
  const personType = scalarTypeOf(plan.dataSet.personType)
  const [first] = salts
  check(personType !== null && first !== undefined && salts.length > plan.keys.length, 'a salt for the person and for each key')
  const mixed = plan.keys.reduce<Expr>(
    (sum, each, i) => {
      const part = hash(key(i), each.type, salts[i + 1] ?? 0n)
      return operator(sum, '#', { kind: 'coalesce', args: [part, cast(integer(0n), 'int8')], at: -1 })
    },
    hash(person, personType, first),
  )
  return [mixed, ...plan.keys.map((_, i) => key(i))].map((by) => ({ by, direction: 'default', using: [], nulls: 'default' }))
}
