import { spawn, type ChildProcess } from 'node:child_process'
import { randomBytes } from 'node:crypto'
import { chmodSync, mkdirSync, mkdtempSync, rmSync, symlinkSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { fileURLToPath } from 'node:url'
import pg from 'pg'
import { scramVerifier } from '../../src/cli/scram.ts'
import { compileFolders } from '../harness/compiled.ts'

type Line = Readonly<Record<string, unknown>> & { readonly event: string }

/** The program as it is run: compiled, in a process of its own, with its state in a directory of its own. */
export interface Program {
  readonly state: string
  readonly policies: string
  run(): Running
  remove(): void
}

export interface Running {
  readonly pid: number
  readonly lines: readonly Line[]
  /** Waits for a line with that event that came after the first `after` lines. */
  line(event: string, after?: number): Promise<Line>
  signal(name: NodeJS.Signals): void
  /** The exit code, or the signal's name. */
  readonly ended: Promise<number | string | null>
  connect(user: string, password: string): Promise<pg.Client>
}

export function makeProgram(vaultUrl: string): Program {
  const directory = mkdtempSync(join(tmpdir(), 'hedgerow-test-'))
  chmodSync(directory, 0o755)
  compileFolders(['.'], directory)
  symlinkSync(fileURLToPath(new URL('../../node_modules', import.meta.url)), join(directory, 'node_modules'))
  const state = join(directory, 'state')
  const policies = join(directory, 'policies')
  mkdirSync(policies)
  const children: ChildProcess[] = []
  const settings = { HEDGEROW_VAULT_URL: vaultUrl, HEDGEROW_STATE: state, HEDGEROW_POLICIES: policies, HEDGEROW_PORT: '0' }
  return {
    state,
    policies,
    run: () => {
      const child = spawn(process.execPath, [join(directory, 'src', 'main.js')], {
        env: { PATH: process.env['PATH'], HOME: process.env['HOME'], ...settings },
        stdio: ['ignore', 'pipe', 'inherit'],
      })
      children.push(child)
      return watch(child)
    },
    remove: () => {
      for (const child of children) child.kill('SIGKILL')
      rmSync(directory, { recursive: true, force: true })
    },
  }
}

function watch(child: ChildProcess): Running {
  const lines: Line[] = []
  let wake: (() => void)[] = []
  let rest = ''
  let over = false
  const stir = (): void => {
    for (const each of wake) each()
    wake = []
  }
  child.stdout?.on('data', (chunk: Buffer) => {
    rest += chunk.toString('utf8')
    const parts = rest.split('\n')
    rest = parts.pop() ?? ''
    lines.push(...parts.map((part) => JSON.parse(part) as Line))
    stir()
  })
  const ended = new Promise<number | string | null>((resolve) => child.once('close', (code, signal) => resolve(code ?? signal)))
  void ended.then(() => {
    over = true
    stir()
  })
  const line = async (event: string, after = 0): Promise<Line> => {
    for (;;) {
      const found = lines.slice(after).find((each) => each.event === event)
      if (found !== undefined) return found
      if (over) throw new Error(`ended without ${event}: ${JSON.stringify(lines)}`)
      await new Promise<void>((resolve) => wake.push(resolve))
    }
  }
  return {
    pid: child.pid ?? 0,
    lines,
    line,
    signal: (name) => void child.kill(name),
    ended,
    connect: async (user, password) => {
      const { port } = await line('serve.ready')
      const client = new pg.Client({ host: '127.0.0.1', port: Number(port), user, password, database: 'ferries' })
      client.on('error', () => undefined)
      await client.connect()
      return client
    },
  }
}

/** Writes analysts.yaml: caps by analyst as YAML flow text; the password is the name, a hyphen and `key`. */
export async function writeAnalysts(policies: string, analysts: Readonly<Record<string, string>>, everyone: string): Promise<void> {
  const lines: string[] = []
  for (const [name, cap] of Object.entries(analysts))
    lines.push(`  ${name}:\n    login: "${await scramVerifier(`${name}-key`, randomBytes(16))}"\n    data: { ferries: ${cap} }`)
  writeFileSync(join(policies, 'analysts.yaml'), `analysts:\n${lines.join('\n')}\neveryone: { ferries: ${everyone} }\n`)
}
