import { didYouMean } from '../policy/near.ts'
import { catalogOf } from '../vault/catalog-of.ts'
import type { Terminal } from './ask.ts'
import { check } from './check.ts'
import { password } from './password.ts'

/** What the commands need to know of the settings. */
export interface CommandSettings {
  /** The directory of the policies. */
  readonly policies: string
  /** Null where HEDGEROW_VAULT_URL is not set. */
  readonly vaultUrl: string | null
}

/** One command with its arguments. Resolves to the exit code: 0 good, 1 bad, 2 not understood. */
export interface Command {
  readonly usage: string
  readonly run: (args: readonly string[], settings: CommandSettings, terminal: Terminal, say: (line: string) => void) => Promise<number>
}

/** The commands about policies, by name. */
export const policyCommands: Readonly<Record<string, Command>> = {
  check: {
    usage: 'check            hold the policies against the vault, and print the verdict',
    run: async (args, settings, _terminal, say) => {
      if (args.length > 0) return misused(say, 'hedgerow check takes no arguments')
      return await check(settings.policies, settings.vaultUrl === null ? noVault : catalogOf(settings.vaultUrl), say)
    },
  },
  password: {
    usage: "password NAME    set an analyst's log-in: asked for twice, or one line from a pipe",
    run: async (args, settings, terminal, say) => {
      const [name] = args
      if (name === undefined || args.length > 1) return misused(say, 'hedgerow password takes the name of one analyst')
      return await password(settings.policies, name, terminal, say)
    },
  },
}

/** Runs the command that `args` name, of those in `commands`. */
export async function runCommand(
  commands: Readonly<Record<string, Command>>,
  args: readonly string[],
  settings: CommandSettings,
  terminal: Terminal,
  say: (line: string) => void,
): Promise<number> {
  const [name, ...rest] = args
  const command = name !== undefined && Object.hasOwn(commands, name) ? commands[name] : undefined
  if (command !== undefined) return await command.run(rest, settings, terminal, say)
  const asked = name === undefined || name === 'help' || name === '--help'
  if (!asked) say(`there is no command ${name}: ${didYouMean(name, Object.keys(commands), 'see below')}`)
  say('usage: hedgerow COMMAND')
  for (const each of Object.values(commands)) say(`  ${each.usage}`)
  return asked && name !== undefined ? 0 : 2
}

function misused(say: (line: string) => void, message: string): number {
  say(message)
  return 2
}

function noVault(): Promise<never> {
  return Promise.reject(new Error('it is not set'))
}
