import { createInterface } from 'node:readline'
import { Writable } from 'node:stream'

/** Streams of a terminal, or of a pipe. */
export interface Terminal {
  readonly input: NodeJS.ReadableStream & { readonly isTTY?: boolean }
  readonly output: NodeJS.WritableStream
}

const lineCeiling = 4096

/** Asks on a terminal without showing what is typed; null where it was broken off with Ctrl-C or Ctrl-D. */
export async function askHidden(terminal: Terminal, prompt: string): Promise<string | null> {
  const silent = new Writable({ write: (_chunk, _encoding, done) => done() })
  const lines = createInterface({ input: terminal.input, output: silent, terminal: true, historySize: 0 })
  terminal.output.write(prompt)
  try {
    return await new Promise<string | null>((resolve) => {
      lines.once('line', resolve)
      lines.once('SIGINT', () => resolve(null))
      lines.once('close', () => resolve(null))
    })
  } finally {
    lines.close()
    terminal.output.write('\n')
  }
}

/** The first line of a pipe without its end; null where there is none, or it is longer than 4096 bytes or not UTF-8. */
export async function readLine(input: NodeJS.ReadableStream): Promise<string | null> {
  const chunks: Buffer[] = []
  let length = 0
  for await (const chunk of input) {
    const bytes = Buffer.from(chunk)
    const end = bytes.indexOf(10)
    const part = end === -1 ? bytes : bytes.subarray(0, end)
    length += part.length
    if (length > lineCeiling) return null
    chunks.push(part)
    if (end !== -1) break
  }
  try {
    const line = new TextDecoder('utf-8', { fatal: true, ignoreBOM: true }).decode(Buffer.concat(chunks)).replace(/\r$/, '')
    return line === '' ? null : line
  } catch {
    return null
  }
}
