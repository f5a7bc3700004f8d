import { Fraction } from '../base/fraction.ts'
import { refuse } from '../base/refusal.ts'
import type { Range, Scalar } from '../catalog/scalar.ts'
import { isNumber, scalarType, type ScalarType } from '../catalog/scalar-type.ts'
import type { Constant } from '../sql/tree.ts'
import type { Parameter } from './context.ts'

/** A literal as PostgreSQL types it: int4, int8, numeric by size; a bare string is of no type yet. */
export function lowerConstant(constant: Constant, at: number): Scalar {
  switch (constant.kind) {
    case 'integer':
      return fixedValue(scalarType('int4'), constant.value, at)
    case 'decimal': {
      const whole = /^\d+$/.test(constant.value)
      const type = whole && BigInt(constant.value) < 2n ** 63n ? 'int8' : 'numeric'
      return fixedValue(scalarType(type), constant.value, at)
    }
    case 'string':
      return fixedValue(scalarType('unknown'), constant.value, at)
    case 'boolean':
      return fixedValue(scalarType('bool'), constant.value ? 'true' : 'false', at)
    case 'null':
      return fixedValue(scalarType('unknown'), null, at)
    case 'bits':
      return refuse('expr.unsupported', { what: 'a bit string' }, at)
  }
}

/** A fixed value of a type, given as text in its input form. */
export function fixedValue(type: ScalarType, text: string | null, at: number): Scalar {
  return { type, node: { kind: 'constant', text }, nullable: text === null, range: exactRange(type, text ?? '0'), carrier: 'own', at }
}

function exactRange(type: ScalarType, text: string): Range | null {
  if (!isNumber(type)) return null
  if (type.family === 'float' && !isExactAs(type.name, text)) return null
  try {
    const value = Fraction.parse(text.trim())
    return { low: value, high: value, step: value.isLess(Fraction.zero) ? value.neg() : value }
  } catch {
    return null // NaN, infinity: no range, so arithmetic with it is refused
  }
}

/** Whether the float of that text, brought to numeric, is the text's own value: it has no more digits than PostgreSQL prints there, and no size at which bits are lost. */
function isExactAs(name: string, text: string): boolean {
  const [, whole = '', rest = ''] = /^\s*[+-]?(\d*)\.?(\d*)\s*$/.exec(text) ?? []
  return whole + rest !== '' && `${whole}${rest}`.replace(/^0+/, '').length <= (name === 'float4' ? 6 : 15) && rest.length <= 30
}

/** A parameter: its value where the statement runs; before that, something of its type that stands in for any value. */
export function lowerParameter(parameter: Parameter, number: number, at: number): Scalar {
  if (parameter.value !== undefined) return fixedValue(parameter.type, parameter.value, at)
  const range = isNumber(parameter.type) ? { low: Fraction.one, high: Fraction.one, step: Fraction.one } : null
  return { type: parameter.type, node: { kind: 'parameter', number }, nullable: true, range, carrier: 'own', at }
}
