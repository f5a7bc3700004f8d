/** The embedded server could not be started or stopped: one message with the reason, and what to do about it. */
export class EmbeddedServerError extends Error {
  override readonly name = 'EmbeddedServerError'
  readonly remedy: string
  constructor(reason: string, remedy: string) {
    super(`${reason}: ${remedy}`)
    this.remedy = remedy
  }
}
