import type pg from 'pg'

export interface RawDescription {
  readonly parameters: readonly number[]
  readonly columns: readonly { readonly name: string; readonly oid: number; readonly modifier: number }[]
}

interface Wire {
  on(event: 'parameterDescription', listener: (message: { readonly dataTypeIDs: readonly number[] }) => void): void
  off(event: 'parameterDescription', listener: (message: { readonly dataTypeIDs: readonly number[] }) => void): void
  parse(query: { readonly text: string; readonly name: string; readonly types: readonly number[] }): void
  describe(message: { readonly type: 'S'; readonly name: string }): void
  sync(): void
}

interface RowDescription {
  readonly fields: readonly { readonly name: string; readonly dataTypeID: number; readonly dataTypeModifier: number }[]
}

/** Parse, Describe (statement), Sync: PostgreSQL analyses the text, and neither plans nor runs it. Rejects with the server's error. */
export function describeOn(client: pg.Client, text: string, parameterTypes: readonly number[]): Promise<RawDescription> {
  const description = new Description(text, parameterTypes)
  client.query(description as unknown as pg.Submittable)
  return description.done
}

class Description {
  readonly done: Promise<RawDescription>
  readonly #text: string
  readonly #types: readonly number[]
  #resolve!: (description: RawDescription) => void
  #reject!: (error: unknown) => void
  #parameters: readonly number[] = []
  #columns: RawDescription['columns'] = []
  #error: unknown = null
  #forget: () => void = () => undefined
  constructor(text: string, types: readonly number[]) {
    this.#text = text
    this.#types = types
    this.done = new Promise((resolve, reject) => {
      this.#resolve = resolve
      this.#reject = reject
    })
  }
  submit(wire: Wire): void {
    const listener = (message: { readonly dataTypeIDs: readonly number[] }): void => {
      this.#parameters = [...message.dataTypeIDs]
    }
    wire.on('parameterDescription', listener)
    this.#forget = () => wire.off('parameterDescription', listener)
    wire.parse({ text: this.#text, name: '', types: this.#types })
    wire.describe({ type: 'S', name: '' })
    wire.sync()
  }
  handleRowDescription(message: RowDescription): void {
    this.#columns = message.fields.map((field) => ({ name: field.name, oid: field.dataTypeID, modifier: field.dataTypeModifier }))
  }
  handleError(error: unknown): void {
    this.#error ??= error
    this.#forget()
    this.#reject(error)
  }
  handleReadyForQuery(): void {
    this.#forget()
    if (this.#error === null) this.#resolve({ parameters: this.#parameters, columns: this.#columns })
  }
  handleDataRow(): void {}
  handleCommandComplete(): void {}
  handleEmptyQuery(): void {}
  handlePortalSuspended(): void {}
  handleCopyInResponse(): void {}
  handleCopyData(): void {}
}
