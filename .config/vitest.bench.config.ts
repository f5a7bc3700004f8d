import { mergeConfig } from 'vitest/config'
import everything from './vitest.config.ts'

/** The measurements: one file after the other, so that none disturbs another, and each prints what it found. */
const { globalSetup: _, include: __, ...rest } = everything.test ?? {}

export default mergeConfig(
  { ...everything, test: rest },
  {
    test: {
      include: ['test/bench/**/*.bench.ts'],
      fileParallelism: false,
      testTimeout: 300_000,
      hookTimeout: 120_000,
      disableConsoleIntercept: true,
      silent: false,
    },
  },
)
