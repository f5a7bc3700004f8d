import { open, readdir } from 'node:fs/promises'
import { join } from 'node:path'
import type { Findings } from '../policy/complaint.ts'
import { fileCeiling } from '../policy/yaml-text.ts'

/** The policy files of a directory (*.yaml, *.yml) in the order of their names; what cannot be read is complained of. */
export async function policyTexts(directory: string, findings: Findings): Promise<readonly { readonly file: string; readonly text: string }[]> {
  const texts: { file: string; text: string }[] = []
  let names: readonly string[]
  try {
    names = (await readdir(directory)).filter((name) => /\.ya?ml$/.test(name) && !name.startsWith('.')).toSorted()
  } catch (error) {
    findings.complain(
      { file: directory, line: 1, column: 1 },
      `the directory cannot be read (${errorCode(error)})`,
      'set HEDGEROW_POLICIES to the directory of the policies',
    )
    return []
  }
  for (const name of names) {
    const file = join(directory, name)
    const place = { file, line: 1, column: 1 }
    try {
      texts.push({ file, text: await boundedText(file) })
    } catch (error) {
      if (error instanceof TypeError) findings.complain(place, 'the file is not UTF-8', 'save it as UTF-8')
      else findings.complain(place, `the file cannot be read (${errorCode(error)})`, 'check its owner and mode')
    }
  }
  return texts
}

/** The code of a system call's error, ENOENT for instance. */
export function errorCode(error: unknown): string {
  return error instanceof Error && 'code' in error ? String(error.code) : 'unknown'
}

/** Somewhat more than a policy may have at the most: what is longer is complained of by its reader, and never held in memory. */
async function boundedText(file: string): Promise<string> {
  const handle = await open(file, 'r')
  try {
    const bytes = Buffer.alloc(fileCeiling + 1)
    let length = 0
    for (;;) {
      const { bytesRead } = await handle.read(bytes, length, bytes.length - length)
      length += bytesRead
      if (bytesRead === 0 || length === bytes.length) break
    }
    const read = bytes.subarray(0, length)
    return length > fileCeiling ? read.toString('latin1') : new TextDecoder('utf-8', { fatal: true }).decode(read)
  } finally {
    await handle.close()
  }
}
