import { z } from 'zod'
import type { PullRequest } from '../answer/ports.ts'

const prefix = 'pull '

const shape = z.strictObject({
  kind: z.enum(['release', 'explain', 'budget', 'charges', 'last_answer', 'bounds']),
  pid: z.int().nonnegative(),
  user: z.string(),
  database: z.string(),
  text: z.string(),
  // A number would have lost its last digits on the way through JSON.parse: the lobby sends numbers as text.
  args: z.array(z.union([z.string(), z.boolean(), z.null()])),
  siblings: z.array(z.string()),
  settings: z.record(z.string(), z.string()),
  timeZone: z.string(),
  now: z.string(),
  statement: z.string(),
  application: z.string(),
}) satisfies z.ZodType<PullRequest>

/** What a simple query on the pull port is. */
export type PullMessage =
  | { readonly kind: 'pull'; readonly request: PullRequest }
  /** A SET or RESET, which libpq may send by itself. */
  | { readonly kind: 'setting'; readonly command: 'SET' | 'RESET' }
  | { readonly kind: 'empty' }
  | { readonly kind: 'unreadable'; readonly message: string }

/** Reads a query's text: `pull ` and a PullRequest in JSON. */
export function readPull(text: string): PullMessage {
  if (text.startsWith(prefix)) return readRequest(text.slice(prefix.length))
  if (text.trim() === '') return { kind: 'empty' }
  const setting = /^\s*(set|reset)\s[^;]*;?\s*$/i.exec(text)?.[1]?.toUpperCase()
  if (setting === 'SET' || setting === 'RESET') return { kind: 'setting', command: setting }
  return { kind: 'unreadable', message: 'only "pull" and a request in JSON is understood here' }
}

function readRequest(json: string): PullMessage {
  let value: unknown
  try {
    value = JSON.parse(json)
  } catch {
    return { kind: 'unreadable', message: 'the request is not JSON' }
  }
  const read = shape.safeParse(value)
  if (read.success) return { kind: 'pull', request: read.data }
  const places = read.error.issues.map((issue) => issue.path.join('.') || 'the request itself')
  return { kind: 'unreadable', message: `the request does not have the agreed shape at: ${[...new Set(places)].join(', ')}` }
}
