import { randomBytes } from 'node:crypto'
import { mkdir, open, readFile } from 'node:fs/promises'
import { join } from 'node:path'

/**
 * The installation's secret, from which the ledger's chain key and the lobby's pull password are made: 32 bytes in `ledger.key`, which only its owner can read;
 * made at the first start. Without it the ledger cannot be verified any more: back it up, away from the database.
 */
export async function stateKey(directory: string): Promise<Uint8Array> {
  await mkdir(directory, { recursive: true })
  const path = join(directory, 'ledger.key')
  try {
    const file = await open(path, 'wx', 0o600)
    try {
      await file.writeFile(`${randomBytes(32).toString('hex')}\n`)
      await file.sync()
    } finally {
      await file.close()
    }
  } catch (problem) {
    if (!(problem instanceof Error && 'code' in problem && problem.code === 'EEXIST')) throw problem
  }
  const key = Buffer.from((await readFile(path, 'utf8')).trim(), 'hex')
  if (key.length !== 32) throw new Error(`${path} does not hold 32 bytes in hexadecimal; restore it from its backup`)
  return key
}
