import { mkdtemp, rename, rm, writeFile } from 'node:fs/promises'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { setTimeout as wait } from 'node:timers/promises'
import { expect, test } from 'vitest'
import { watchPolicies } from '../../src/files/watch-policies.ts'

test('tells of changes to policy files once each, however many steps they take, and of nothing else', async () => {
  const directory = await mkdtemp(join(tmpdir(), 'watch-'))
  let changes = 0
  const watch = watchPolicies(
    directory,
    () => changes++,
    () => undefined,
  )
  try {
    await writeFile(join(directory, 'notes.txt'), 'a')
    await wait(400)
    expect(changes).toBe(0)
    for (let step = 0; step < 5; step++) await writeFile(join(directory, 'ferries.yaml'), `step: ${step}`)
    await expect.poll(() => changes, { timeout: 3000 }).toBe(1)
    await writeFile(join(directory, '.ferries.yaml.new'), 'x')
    await rename(join(directory, '.ferries.yaml.new'), join(directory, 'ferries.yaml'))
    await expect.poll(() => changes, { timeout: 3000 }).toBe(2)
    await wait(400)
    expect(changes).toBe(2)
  } finally {
    watch.close()
    await rm(directory, { recursive: true, force: true })
  }
})
