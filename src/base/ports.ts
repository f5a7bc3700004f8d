/** The world as the pure layers see it; the edges make the real ones, tests make their own. */

/** Milliseconds since the epoch, and waiting. */
export interface Clock {
  now(): number
  /** Resolves at instant `atMs`, or rejects with the signal's reason. */
  until(atMs: number, signal?: AbortSignal): Promise<void>
}

/** Uniform random bytes, from the system's generator outside of tests. */
export interface RandomBytes {
  (count: number): Uint8Array
}

export type LogLevel = 'info' | 'warn' | 'error'

/** One event a line. Fields carry names, codes and numbers: never SQL text, literals, answers or a server's message. */
export interface Log {
  (level: LogLevel, event: string, fields?: Readonly<Record<string, string | number | boolean | null>>): void
}
