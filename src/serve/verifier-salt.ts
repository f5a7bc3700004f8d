import type { ScramSalt } from '../wire/scram.ts'

/** Salt and iterations of a PostgreSQL SCRAM verifier: SCRAM-SHA-256$<iterations>:<salt>$<stored key>:<server key>. */
export function saltOfVerifier(verifier: string | null): ScramSalt | null {
  const [, iterations, salt] = /^SCRAM-SHA-256\$(\d+):([A-Za-z0-9+/=]+)\$/.exec(verifier ?? '') ?? []
  return iterations === undefined || salt === undefined ? null : { iterations: Number(iterations), salt: Buffer.from(salt, 'base64') }
}
