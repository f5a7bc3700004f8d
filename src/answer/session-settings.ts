import { Fraction } from '../base/fraction.ts'
import { refuse } from '../base/refusal.ts'
import type { Wish } from '../noise/choose.ts'
import type { Limits } from '../plan/limits.ts'
import type { DataSet } from '../policy/data-set.ts'

/** A session's hedgerow.* settings, read; what was never set is the data set's. */
export interface SessionSettings {
  readonly epsilon: Fraction
  readonly delta: Fraction
  readonly confidence: Fraction
  readonly noise: Wish
  readonly limits: Limits
  readonly nonnegative: boolean
}

const yes: ReadonlySet<string> = new Set(['on', 'true', 'yes', '1'])
const no: ReadonlySet<string> = new Set(['off', 'false', 'no', '0'])

/** Reads the settings of one pull; the first bad one is refused with what it takes. */
export function readSessionSettings(raw: Readonly<Record<string, string>>, dataSet: DataSet): SessionSettings {
  const text = (name: string): string => (raw[name] ?? '').trim()
  const unset = (name: string, expected: string): void => {
    if (text(name) !== '') refuse('setting.bad', { name, value: text(name), expected, sample: "''" })
  }
  unset('margin', 'no value yet: set hedgerow.epsilon and read the margin in EXPLAIN')
  if (text('replay') !== '' && text('replay') !== 'off')
    refuse('setting.bad', { name: 'replay', value: text('replay'), expected: 'only off: every release is drawn anew', sample: 'off' })
  return {
    epsilon: positive('epsilon', text('epsilon') || dataSet.defaults.epsilon, 'a number from 1e-9 to 1e40', '0.1'),
    delta: share('delta', text('delta') || dataSet.defaults.delta, '0, or a number from 1e-30 to below 1', '1e-8'),
    confidence: share('confidence', text('confidence') || '0.95', 'a number from 0 to 0.999999999999', '0.95'),
    noise: wish(text('noise')),
    limits: { groups: limit('groups', text('groups')), rows: limit('rows', text('rows')) },
    nonnegative: flag('nonnegative', text('nonnegative')),
  }
}

function parsed(name: string, value: string, expected: string, sample: string): Fraction {
  try {
    return Fraction.parse(value)
  } catch {
    return refuse('setting.bad', { name, value, expected, sample })
  }
}

/** Beyond these nothing is gained, and the exact arithmetic of noise and margins would hold up everybody. */
const [leastEpsilon, mostEpsilon] = [Fraction.parse('1e-9'), Fraction.parse('1e40')]
const [leastShare, mostConfidence] = [Fraction.parse('1e-30'), Fraction.parse('0.999999999999')]

function positive(name: string, value: string, expected: string, sample: string): Fraction {
  const number = parsed(name, value, expected, sample)
  return leastEpsilon.isAtMost(number) && number.isAtMost(mostEpsilon) ? number : refuse('setting.bad', { name, value, expected, sample })
}

function share(name: string, value: string, expected: string, sample: string): Fraction {
  const number = parsed(name, value, expected, sample)
  const inside = number.isZero() || (leastShare.isAtMost(number) && (name === 'confidence' ? number.isAtMost(mostConfidence) : number.isLess(Fraction.one)))
  return inside ? number : refuse('setting.bad', { name, value, expected, sample })
}

function wish(value: string): Wish {
  if (value === '' || value === 'auto') return 'auto'
  return value === 'laplace' || value === 'gaussian'
    ? value
    : refuse('setting.bad', { name: 'noise', value, expected: 'auto, laplace or gaussian', sample: 'auto' })
}

function limit(name: string, value: string): bigint | null {
  if (value === '') return null
  return /^[1-9]\d{0,8}$/.test(value)
    ? BigInt(value)
    : refuse('setting.bad', { name, value, expected: 'a whole number from 1, or nothing for the policy’s own bound', sample: '5' })
}

function flag(name: string, value: string): boolean {
  if (value === '' || no.has(value.toLowerCase())) return false
  return yes.has(value.toLowerCase()) ? true : refuse('setting.bad', { name, value, expected: 'on or off', sample: 'on' })
}
