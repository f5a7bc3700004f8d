import type { Describer } from './block-types.ts'
import type { GiveParts } from './give.ts'
import type { InForce } from './in-force.ts'
import type { LastAnswers } from './last-answers.ts'
import type { Lobby } from './ports.ts'

/** What answering a pull works with. */
export interface PullParts extends GiveParts {
  readonly lobby: Lobby
  readonly describer: Describer
  readonly lastAnswers: LastAnswers
  /** The policies in force, as of now. */
  inForce(): InForce
}
