import { refusals } from './refusals.ts'

export type RefusalCode = keyof typeof refusals

/** What a refusal's message and hint are made of: texts the analyst or the policy wrote, never data. */
export type Facts = Readonly<Record<string, string>>

/** A statement turned away before rows were read, with reason and remedy. */
export class Refusal extends Error {
  override readonly name = 'Refusal'
  readonly code: RefusalCode
  readonly sqlstate: string
  readonly hint: string
  /** Byte offset into the analyst's text, -1 where there is no place. */
  readonly at: number
  readonly facts: Facts
  constructor(code: RefusalCode, facts: Facts, at: number) {
    super(`${fill(refusals[code].message, facts)} [${code}]`)
    this.code = code
    this.facts = facts
    this.sqlstate = refusals[code].sqlstate
    this.hint = fill(refusals[code].hint, facts)
    this.at = at
  }
}

/** Turns the statement away. `facts` fill the `{name}` places of the registry's message and hint. */
export function refuse(code: RefusalCode, facts: Facts = {}, at = -1): never {
  throw new Refusal(code, facts, at)
}

/** Runs `work`; a refusal out of it gets the facts it lacks, such as an example made of the statement's own tables. */
export function withFacts<T>(facts: () => Facts, work: () => T): T {
  try {
    return work()
  } catch (problem) {
    throw problem instanceof Refusal ? completed(problem, facts()) : problem
  }
}

/** The same refusal with facts for the places it left open; those it has stay. */
export function completed(refusal: Refusal, facts: Facts): Refusal {
  return new Refusal(refusal.code, { ...facts, ...refusal.facts }, refusal.at)
}

function fill(text: string, facts: Facts): string {
  return text.replace(/\{(\w+)\}/g, (place, name: string) => facts[name] ?? place)
}
