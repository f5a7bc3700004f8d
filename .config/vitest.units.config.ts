import { mergeConfig } from 'vitest/config'
import everything from './vitest.config.ts'

/** The tests of the pure layers; those of answer/ ask a whole Hedgerow, and are left to `npm test`. */
const pure = ['base', 'sql', 'catalog', 'policy', 'plan', 'bound', 'noise', 'budget', 'release']

const { globalSetup: _, include: __, ...rest } = everything.test ?? {}

export default mergeConfig(
  { ...everything, test: rest },
  { test: { include: [...pure.map((folder) => `test/${folder}/**/*.test.ts`), 'test/settings.test.ts'] } },
)
