export interface RefusalRow {
  /** 42501 what privacy forbids or a spent budget; 42803 a missing aggregate; 22023 a bad setting; 54001, 42601 and the like where PostgreSQL itself would say so. */
  readonly sqlstate: string
  /** Lower case, no final period; `{name}` is filled with facts. */
  readonly message: string
  /** Ends in SQL that works, or in who can help. */
  readonly hint: string
  /** One line for the README: why. */
  readonly why: string
}

/** Every code a statement can be refused with. The README lists the same codes; a test holds both to each other. */
export const refusals = {
  'text.too-long': {
    sqlstate: '54000',
    message: 'a statement over private tables may be {ceiling} bytes long, this one has {length}',
    hint: 'Split it, or put long lists into a temporary table and join it to the finished result.',
    why: 'reading a statement costs memory in proportion to its length',
  },
  'text.too-deep': {
    sqlstate: '54001',
    message: 'the statement nests too deeply to be read',
    hint: 'Write the same condition flatter, for example with IN or = ANY (ARRAY[…]) instead of nested parentheses.',
    why: 'the parser has a fixed stack',
  },
  'text.unreadable': {
    sqlstate: '42601',
    message: 'this form of {what} cannot be read over private tables',
    hint: 'Leave it out, or apply it to the finished result: SELECT … FROM (<the aggregate query>) AS answer.',
    why: 'what is not understood in full is not answered',
  },
} as const satisfies Readonly<Record<string, RefusalRow>>
