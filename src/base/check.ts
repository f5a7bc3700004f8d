/** A fact that only our own mistake can make false. */
export class BrokenCheck extends Error {
  override readonly name = 'BrokenCheck'
}

/** Holds `fact`, or stops with our own bug named by `what`. Never used on input. */
export function check(fact: unknown, what: string): asserts fact {
  if (!fact) throw new BrokenCheck(what)
}

/** The end of a switch over a union: a forgotten case does not compile. */
export function unreachable(value: never): never {
  throw new BrokenCheck(`unreachable case ${JSON.stringify(value)}`)
}
