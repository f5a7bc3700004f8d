#!/usr/bin/env node
import process from 'node:process'
import { policyCommands, runCommand } from './cli/run.ts'
import { SettingsError, readSettings } from './settings.ts'

const say = (line: string): void => {
  process.stdout.write(`${line}\n`)
}

try {
  const settings = readSettings()
  process.exitCode = await runCommand(policyCommands, process.argv.slice(2), settings, { input: process.stdin, output: process.stderr }, say)
} catch (error) {
  if (!(error instanceof SettingsError)) throw error
  for (const complaint of error.complaints) say(complaint)
  process.exitCode = 1
}
