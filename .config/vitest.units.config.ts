import { mergeConfig } from 'vitest/config'
import everything from './vitest.config.ts'

/** The tests of the pure layers: no server, no socket. */
const pure = ['base', 'sql', 'catalog', 'policy', 'plan', 'bound', 'noise', 'budget', 'release', 'answer']

const { globalSetup: _, include: __, ...rest } = everything.test ?? {}

export default mergeConfig(
  { ...everything, test: rest },
  { test: { include: [...pure.map((folder) => `test/${folder}/**/*.test.ts`), 'test/settings.test.ts'] } },
)
