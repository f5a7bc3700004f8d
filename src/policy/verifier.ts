const form = /^SCRAM-SHA-256\$(\d{1,10}):([A-Za-z0-9+/]+={0,2})\$([A-Za-z0-9+/]{43}=):([A-Za-z0-9+/]{43}=)$/

/** Least iterations of a verifier that is accepted (RFC 7677, section 4). */
export const leastIterations = 4096

/** Whether a text is a password verifier as PostgreSQL keeps it: `SCRAM-SHA-256$iterations:salt$StoredKey:ServerKey` (RFC 5803's fields). */
export function isVerifier(text: string): boolean {
  const found = form.exec(text)
  if (found === null) return false
  const iterations = Number(found[1])
  const salt = found[2] ?? ''
  return iterations >= leastIterations && iterations <= 2_147_483_647 && salt.length % 4 === 0 && salt.length <= 1368
}
