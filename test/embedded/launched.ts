import { spawn } from 'node:child_process'
import type { ChildProcess } from 'node:child_process'
import { once } from 'node:events'
import { writeFileSync } from 'node:fs'
import { join } from 'node:path'
import { createInterface } from 'node:readline'
import { processIdentity } from '../../src/embedded/processes.ts'
import { compileFolders } from '../harness/compiled.ts'

/** A process that started a server, seen from outside. */
export interface Launched {
  readonly child: ChildProcess
  readonly url: string
  readonly pid: number
}

const program = `
import { startServer } from './src/embedded/server.js'
process.stdin.on('data', () => process.exit(0))
try {
  const server = await startServer(JSON.parse(process.argv[2]))
  console.log(JSON.stringify({ url: server.url(), pid: server.pid }))
} catch (error) {
  console.log(JSON.stringify({ error: error.message }))
  process.exit(1)
}
setInterval(() => undefined, 1000)
`

/** Makes a program in `directory` that starts a server as its argument says and stays. */
export function writeLauncher(directory: string): string {
  compileFolders(['embedded', 'base'], directory)
  const file = join(directory, 'launch.js')
  writeFileSync(file, program)
  return file
}

/** Runs that program and waits for its server, or throws what it said. Any word on its standard input makes it exit. */
export async function launch(file: string, options: object, account: { uid?: number; gid?: number; env?: NodeJS.ProcessEnv } = {}): Promise<Launched> {
  const child = spawn(process.execPath, [file, JSON.stringify(options)], { stdio: ['pipe', 'pipe', 'inherit'], cwd: '/', ...account })
  const [line] = (await once(createInterface(child.stdout), 'line')) as [string]
  const { url, pid, error } = JSON.parse(line) as { url: string; pid: number; error?: string }
  if (error !== undefined) throw new Error(error)
  return { child, url, pid }
}

/** Ends what `launch` started and waits for it. */
export async function endLaunched({ child }: Launched, signal: NodeJS.Signals = 'SIGKILL'): Promise<void> {
  if (child.exitCode !== null || child.signalCode !== null) return
  const exited = once(child, 'exit')
  child.kill(signal)
  await exited
}

/** Waits until the process has ended, reaped by its parent or not. */
export async function gone(pid: number, withinMs = 10_000): Promise<boolean> {
  for (const until = Date.now() + withinMs; Date.now() < until;) {
    if (!(await running(pid))) return true
    await new Promise((resolve) => setTimeout(resolve, 25))
  }
  return false
}

/** Whether the process runs. */
export async function running(pid: number): Promise<boolean> {
  return (await processIdentity(pid)) !== undefined
}
