/** Why the lobby cannot be made as the policy says: for the operator, with the remedy. Nothing of it reaches an analyst. */
export class LobbyProblem extends Error {
  override readonly name = 'LobbyProblem'
  readonly remedy: string
  constructor(message: string, remedy: string) {
    super(`${message}; ${remedy}`)
    this.remedy = remedy
  }
}
