import { execFileSync } from 'node:child_process'
import { expect, test } from 'vitest'
import { testBackend } from './backend.ts'

const engineAnswers = ((): boolean => {
  try {
    execFileSync('docker', ['info'], { stdio: 'ignore', timeout: 20_000 })
    return true
  } catch {
    return false
  }
})()

test('a server of one’s own is used as it is, and left running', async () => {
  const backend = await testBackend({ HEDGEROW_TEST_DATABASE_URL: 'postgresql://keeper@db.example/postgres', HEDGEROW_TEST_IMAGE: 'postgres:17' })
  expect(backend.url).toBe('postgresql://keeper@db.example/postgres')
  await backend.stop()
})

test.skipIf(engineAnswers)('an image without a Docker engine is a clear failure, never a silent change of servers', async () => {
  await expect(testBackend({ HEDGEROW_TEST_IMAGE: 'postgres:17' })).rejects.toThrow(
    /HEDGEROW_TEST_IMAGE is postgres:17, but no container of it starts \(.+\): see that a Docker engine answers/,
  )
})
