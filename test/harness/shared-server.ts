import type { TestProject } from 'vitest/node'
import { testBackend } from './backend.ts'

/** One server for the whole run: started before the first test file, handed to `testServer`, stopped after the last. */
export async function setup(project: TestProject): Promise<() => Promise<void>> {
  const backend = await testBackend()
  project.provide('hedgerowTestServer', backend.url)
  return async () => await backend.stop()
}
