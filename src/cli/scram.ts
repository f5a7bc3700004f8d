import { createHash, createHmac, pbkdf2 } from 'node:crypto'
import { promisify } from 'node:util'

/** Least iterations that RFC 7677 (section 4) asks for, and PostgreSQL's own default: log-in costs as much. */
export const scramIterations = 4096

/**
 * A SCRAM-SHA-256 verifier as PostgreSQL keeps it, for a password that is prepared already (see `prepared-password.ts`).
 * RFC 5802, section 3: StoredKey = H(HMAC(SaltedPassword, "Client Key")), ServerKey = HMAC(SaltedPassword, "Server Key").
 */
export async function scramVerifier(password: string, salt: Uint8Array, iterations = scramIterations): Promise<string> {
  const salted = await promisify(pbkdf2)(Buffer.from(password, 'utf8'), salt, iterations, 32, 'sha256')
  const clientKey = createHmac('sha256', salted).update('Client Key').digest()
  const storedKey = createHash('sha256').update(clientKey).digest('base64')
  const serverKey = createHmac('sha256', salted).update('Server Key').digest('base64')
  return `SCRAM-SHA-256$${iterations}:${Buffer.from(salt).toString('base64')}$${storedKey}:${serverKey}`
}
