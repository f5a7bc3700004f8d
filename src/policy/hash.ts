import { createHash } from 'node:crypto'

/** sha256 of a policy file's text, in hex: names the version of the policy an answer was given under. */
export function hashOf(text: string): string {
  return createHash('sha256').update(text, 'utf8').digest('hex')
}
