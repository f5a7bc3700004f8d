import { execFileSync, spawn } from 'node:child_process'
import { passwordOf, type TestHedgerow } from '../harness/hedgerow.ts'

/** The major version of the psql of this machine, or null where there is none. */
export const psqlVersion: number | null = ((): number | null => {
  try {
    return Number(/\d+/.exec(execFileSync('psql', ['--version'], { encoding: 'utf8' }))?.[0] ?? '0')
  } catch {
    return null
  }
})()

/** Whether `script`, which gives a program a terminal, is here. */
export const hasTerminal: boolean = ((): boolean => {
  try {
    return execFileSync('script', ['--version'], { encoding: 'utf8' }).includes('util-linux')
  } catch {
    return false
  }
})()

export interface Ended {
  readonly code: number | null
  readonly out: string
  readonly err: string
}

function environment(password: string): NodeJS.ProcessEnv {
  return {
    PATH: process.env['PATH'],
    HOME: '/nonexistent',
    PGPASSWORD: password,
    PSQLRC: '/dev/null',
    PSQL_HISTORY: '/dev/null',
    PAGER: 'cat',
    LC_ALL: 'C.UTF-8',
    TERM: 'xterm',
  }
}

function target(server: TestHedgerow, user: string): readonly string[] {
  return ['-X', '-h', '127.0.0.1', '-p', server.hedgerow.port.toString(), '-U', user, '-d', server.dataSet]
}

/** Feeds a script to psql and waits for its end. */
export function psql(
  server: TestHedgerow,
  script: string,
  options: { readonly user?: string; readonly password?: string; readonly args?: readonly string[] } = {},
): Promise<Ended> {
  const user = options.user ?? 'ana'
  const child = spawn('psql', [...target(server, user), ...(options.args ?? [])], { env: environment(options.password ?? passwordOf(user)), timeout: 20_000 })
  return ended(child, script)
}

function ended(child: ReturnType<typeof spawn>, script: string): Promise<Ended> {
  let out = ''
  let err = ''
  child.stdout?.on('data', (chunk: Buffer) => (out += chunk.toString('utf8')))
  child.stderr?.on('data', (chunk: Buffer) => (err += chunk.toString('utf8')))
  child.stdin?.end(script)
  return new Promise((resolve, reject) => {
    child.once('error', reject)
    child.once('close', (code) => resolve({ code, out, err }))
  })
}

/** psql on a terminal of its own: types each text, waits until the screen has shown what is expected after it, and returns the whole screen. */
export async function typeInto(server: TestHedgerow, steps: readonly (readonly [text: string, shown: RegExp])[]): Promise<string> {
  const command = ['psql', ...target(server, 'ana')].join(' ')
  const child = spawn('script', ['-qec', command, '/dev/null'], { env: environment(passwordOf('ana')), timeout: 25_000 })
  let screen = ''
  let wake = (): void => undefined
  child.stdout.on('data', (chunk: Buffer) => {
    screen += chunk.toString('utf8')
    wake()
  })
  const closed = new Promise<void>((resolve) => child.once('close', () => resolve()))
  let over = false
  void closed.then(() => {
    over = true
    wake()
  })
  const until = async (shown: RegExp, from: number): Promise<void> => {
    while (!shown.test(screen.slice(from))) {
      if (over) throw new Error(`psql ended without showing ${shown.source}: ${screen}`)
      await new Promise<void>((resolve) => (wake = resolve))
    }
  }
  await until(/=> /, 0)
  for (const [text, shown] of steps) {
    const from = screen.length
    child.stdin.write(text)
    await until(shown, from)
  }
  child.stdin.write('\x03\\q\n')
  await closed
  return screen
}
