/** Strict readers for dates, times and lengths of time: ISO 8601 forms alone, independent of any server's settings. Everything counts in microseconds (dates: in days). */

const second = 1_000_000n
const day = 86_400n * second

const dateForm = /^(\d{4})-(\d{2})-(\d{2})$/
const timeForm = /^(\d{2}):(\d{2})(?::(\d{2})(?:\.(\d{1,6}))?)?$/
const momentForm = /^(\d{4}-\d{2}-\d{2})(?:[ T]([\d:.]+))?(?: ?(Z|[+-]\d{2}(?::?\d{2})?))?$/
const wordForm = /^([+-]?)(\d{1,9}) (day|hour|minute|second)s?$/
const isoForm = /^([+-]?)P(?:(\d{1,7})D)?(?:T(?:(\d{1,9})H)?(?:(\d{1,9})M)?(?:(\d{1,9})(?:\.(\d{1,6}))?S)?)?$/
const clockForm = /^([+-]?)(\d{1,8}):(\d{2})(?::(\d{2})(?:\.(\d{1,6}))?)?$/

/** 2025-01-31 → days since 1970-01-01; null where there is no such day. Years 0001 to 9999. */
export function readDate(text: string): bigint | null {
  const found = dateForm.exec(text)
  if (found === null) return null
  const [year, month, dayOfMonth] = [Number(found[1]), Number(found[2]), Number(found[3])]
  if (year < 1 || month < 1 || month > 12 || dayOfMonth < 1 || dayOfMonth > daysIn(year, month)) return null
  return daysSince1970(year, month, dayOfMonth)
}

/** 23:59 or 23:59:30.5 → microseconds since midnight. */
export function readTime(text: string): bigint | null {
  const found = timeForm.exec(text)
  if (found === null) return null
  const [hours, minutes, seconds] = [BigInt(found[1] ?? 0), BigInt(found[2] ?? 0), BigInt(found[3] ?? 0)]
  if (hours > 23n || minutes > 59n || seconds > 59n) return null
  return (hours * 3600n + minutes * 60n + seconds) * second + fraction(found[4])
}

/** A date alone is its midnight. With `zoned`, an offset may follow and UTC is meant without one; microseconds since 1970 (UTC). */
export function readMoment(text: string, zoned: boolean): bigint | null {
  const found = momentForm.exec(text)
  if (found === null) return null
  const days = readDate(found[1] ?? '')
  const time = found[2] === undefined ? 0n : readTime(found[2])
  const offset = found[3] === undefined ? 0n : zoned ? readOffset(found[3]) : null
  if (days === null || time === null || offset === null) return null
  const moment = days * day + time - offset
  return moment < earliest || moment >= latest ? null : moment
}

/** `90 minutes`, `1 day`, `PT1H30M`, `36:00`: days and less, a day being 24 hours as PostgreSQL compares them. */
export function readInterval(text: string): bigint | null {
  const word = wordForm.exec(text)
  if (word !== null) {
    const unit = { day, hour: 3600n * second, minute: 60n * second, second }[word[3] as 'day' | 'hour' | 'minute' | 'second']
    return signed(word[1], BigInt(word[2] ?? 0) * unit)
  }
  const clock = clockForm.exec(text)
  if (clock !== null) {
    const [minutes, seconds] = [BigInt(clock[3] ?? 0), BigInt(clock[4] ?? 0)]
    if (minutes > 59n || seconds > 59n) return null
    return signed(clock[1], (BigInt(clock[2] ?? 0) * 3600n + minutes * 60n + seconds) * second + fraction(clock[5]))
  }
  const iso = isoForm.exec(text)
  if (iso === null || /[PT]$/.test(text)) return null
  const seconds = BigInt(iso[3] ?? 0) * 3600n + BigInt(iso[4] ?? 0) * 60n + BigInt(iso[5] ?? 0)
  return signed(iso[1], BigInt(iso[2] ?? 0) * day + seconds * second + fraction(iso[6]))
}

export function printDate(days: bigint): string {
  const [year, month, dayOfMonth] = civil(Number(days))
  return `${String(year).padStart(4, '0')}-${two(month)}-${two(dayOfMonth)}`
}

export function printTime(microseconds: bigint): string {
  const seconds = microseconds / second
  const rest = microseconds % second
  const fine = rest === 0n ? '' : `.${rest.toString().padStart(6, '0').replace(/0+$/, '')}`
  return `${two(seconds / 3600n)}:${two((seconds / 60n) % 60n)}:${two(seconds % 60n)}${fine}`
}

export function printMoment(microseconds: bigint, zoned: boolean): string {
  const time = ((microseconds % day) + day) % day
  return `${printDate((microseconds - time) / day)} ${printTime(time)}${zoned ? '+00' : ''}`
}

export function printInterval(microseconds: bigint): string {
  return microseconds < 0n ? `-${printTime(-microseconds)}` : printTime(microseconds)
}

function readOffset(text: string): bigint | null {
  if (text === 'Z') return 0n
  const hours = BigInt(text.slice(1, 3))
  const minutes = BigInt(text.slice(3).replace(':', '') || 0)
  return hours > 15n || minutes > 59n ? null : signed(text[0], (hours * 60n + minutes) * 60n * second)
}

function fraction(digits: string | undefined): bigint {
  return BigInt((digits ?? '').padEnd(6, '0'))
}

function signed(sign: string | undefined, value: bigint): bigint {
  return sign === '-' ? -value : value
}

function two(value: bigint | number): string {
  return value.toString().padStart(2, '0')
}

function daysIn(year: number, month: number): number {
  if (month === 2) return (year % 4 === 0 && year % 100 !== 0) || year % 400 === 0 ? 29 : 28
  return [4, 6, 9, 11].includes(month) ? 30 : 31
}

/** Years counted from March, so that the leap day comes last; 400 Gregorian years are 146,097 days. */
function daysSince1970(year: number, month: number, dayOfMonth: number): bigint {
  const marchYear = month <= 2 ? year - 1 : year
  const marchMonth = (month + 9) % 12
  const days = 365 * marchYear + Math.floor(marchYear / 4) - Math.floor(marchYear / 100) + Math.floor(marchYear / 400)
  return BigInt(days + Math.floor((153 * marchMonth + 2) / 5) + dayOfMonth - 1 - 719_468)
}

function civil(days: number): readonly [year: number, month: number, dayOfMonth: number] {
  const shifted = days + 719_468
  const era = Math.floor(shifted / 146_097)
  const dayOfEra = shifted - era * 146_097
  const yearOfEra = Math.floor((dayOfEra - Math.floor(dayOfEra / 1460) + Math.floor(dayOfEra / 36_524) - Math.floor(dayOfEra / 146_096)) / 365)
  const dayOfYear = dayOfEra - (365 * yearOfEra + Math.floor(yearOfEra / 4) - Math.floor(yearOfEra / 100))
  const marchMonth = Math.floor((5 * dayOfYear + 2) / 153)
  const month = marchMonth < 10 ? marchMonth + 3 : marchMonth - 9
  return [yearOfEra + era * 400 + (month <= 2 ? 1 : 0), month, dayOfYear - Math.floor((153 * marchMonth + 2) / 5) + 1]
}

const earliest = daysSince1970(1, 1, 1) * day
const latest = daysSince1970(10_000, 1, 1) * day
