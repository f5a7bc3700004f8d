import { type ChildProcess, spawn } from 'node:child_process'
import { once } from 'node:events'
import { writeFileSync } from 'node:fs'
import { join } from 'node:path'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { compileFolders } from '../harness/compiled.ts'
import { scratchDirectory } from '../harness/server.ts'

const scratch = scratchDirectory('hedgerow-stop')
const stopMs = 300

beforeAll(() => {
  compileFolders(['serve'], scratch.path)
  writeFileSync(
    join(scratch.path, 'stops.js'),
    `import { onStopSignal } from './src/serve/stop-signal.js'
     const [, , ms] = process.argv
     setInterval(() => undefined, 1000)
     onStopSignal((signal) => { console.log('stopping after', signal); setTimeout(() => process.exit(0), Number(ms)) })
     console.log('ready')`,
  )
})
afterAll(() => scratch.remove())

async function started(ms: number): Promise<{ readonly child: ChildProcess; readonly code: Promise<number | null>; readonly said: () => string }> {
  const child = spawn(process.execPath, [join(scratch.path, 'stops.js'), String(ms)], { stdio: ['ignore', 'pipe', 'inherit'] })
  let said = ''
  child.stdout.setEncoding('utf8').on('data', (text: string) => (said += text))
  const code = once(child, 'exit').then(([exit]) => exit as number | null)
  while (!said.includes('ready')) await once(child.stdout, 'data')
  return { child, code, said: () => said }
}

describe('a signal to stop', () => {
  test.each(['SIGINT', 'SIGTERM'] as const)('%s ends the program when it has put its things away', async (signal) => {
    const { child, code, said } = await started(stopMs)
    child.kill(signal)
    expect(await code).toBe(0)
    expect(said()).toContain(`stopping after ${signal}`)
  })

  test('that npm hands on a second time does not break off the stop', async () => {
    const { child, code, said } = await started(stopMs)
    child.kill('SIGINT')
    await new Promise((resolve) => setTimeout(resolve, 50))
    child.kill('SIGINT')
    expect(await code).toBe(0)
    expect(said().match(/stopping/g)).toHaveLength(1)
  })

  test('given again later ends the program at once', async () => {
    const { child, code } = await started(60_000)
    child.kill('SIGINT')
    await new Promise((resolve) => setTimeout(resolve, 1_300))
    child.kill('SIGINT')
    expect(await code).toBe(1)
  })
})
