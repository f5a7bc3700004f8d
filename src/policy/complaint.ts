/** Where something stands in a policy file; lines and columns count from 1. */
export interface Place {
  readonly file: string
  readonly line: number
  readonly column: number
}

/** One thing wrong with a policy (or, as a warning, one thing to think about), with its place and what to do. */
export interface Complaint extends Place {
  readonly message: string
  readonly remedy: string
}

/** Policies as they were read: all or nothing, with every complaint at once. */
export type Outcome<T> =
  | { readonly kind: 'fits'; readonly value: T; readonly warnings: readonly Complaint[] }
  | { readonly kind: 'complaints'; readonly complaints: readonly Complaint[]; readonly warnings: readonly Complaint[] }

/** Collects complaints and warnings while a file is gone through, so that one mistake does not hide the next. */
export class Findings {
  readonly #complaints: Complaint[] = []
  readonly #warnings: Complaint[] = []

  complain(place: Place, message: string, remedy: string): void {
    this.#complaints.push(at(place, message, remedy))
  }

  warn(place: Place, message: string, remedy: string): void {
    this.#warnings.push(at(place, message, remedy))
  }

  take(outcome: { readonly complaints?: readonly Complaint[]; readonly warnings: readonly Complaint[] }): void {
    this.#complaints.push(...(outcome.complaints ?? []))
    this.#warnings.push(...outcome.warnings)
  }

  /** Whether nothing was complained of so far. */
  get clean(): boolean {
    return this.#complaints.length === 0
  }

  /** `value` if nothing was complained of; `make` is not called otherwise. */
  outcome<T>(make: () => T): Outcome<T> {
    const warnings = inOrder(this.#warnings)
    if (this.#complaints.length > 0) return { kind: 'complaints', complaints: inOrder(this.#complaints), warnings }
    return { kind: 'fits', value: make(), warnings }
  }
}

/** In the order of the files' text. */
export function inOrder(complaints: readonly Complaint[]): readonly Complaint[] {
  return complaints.toSorted((a, b) => (a.file < b.file ? -1 : a.file > b.file ? 1 : a.line - b.line || a.column - b.column))
}

/** `file:line:column: message`, the remedy on a line of its own. */
export function printComplaint(complaint: Complaint): string {
  return `${complaint.file}:${complaint.line}:${complaint.column}: ${complaint.message}\n    ${complaint.remedy}`
}

function at(place: Place, message: string, remedy: string): Complaint {
  return { file: place.file, line: place.line, column: place.column, message, remedy }
}
