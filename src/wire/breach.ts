/** The other side broke the protocol, or may not come in: what it is told before the connection ends. */
export class Breach extends Error {
  override readonly name = 'Breach'
  readonly sqlstate: string
  readonly detail: string
  constructor(sqlstate: string, message: string, detail = '') {
    super(message)
    this.sqlstate = sqlstate
    this.detail = detail
  }
}

/** The other side closed the connection. */
export class Gone extends Error {
  override readonly name = 'Gone'
}
