import { createHmac, randomBytes } from 'node:crypto'
import type { Clock, Log, RandomBytes } from '../base/ports.ts'
import { createAnswerPull } from '../answer/answer-pull.ts'
import { createDescriber } from '../answer/block-types.ts'
import { createGate } from '../answer/create-gate.ts'
import type { InForce } from '../answer/in-force.ts'
import { createLastAnswers } from '../answer/last-answers.ts'
import { createOverruns } from '../answer/overruns.ts'
import { createStatementLog } from '../answer/statement-log.ts'
import { loadPolicies } from '../files/load-policies.ts'
import { openLedger } from '../ledger/open.ts'
import { connectLobby } from '../lobby/client.ts'
import { installLobby } from '../lobby/install.ts'
import { type Complaint, printComplaint } from '../policy/complaint.ts'
import type { Policies } from '../policy/data-set.ts'
import { createParser } from '../sql/parser.ts'
import { connectVault } from '../vault/ask.ts'
import { readCatalog } from '../vault/catalog.ts'
import { serveClients, type Wire } from '../wire/listen.ts'
import { pullCeilings, servePulls } from '../wire/pull-port.ts'
import type { ScramSalt } from '../wire/scram.ts'
import { wireCeilings } from '../wire/wire-options.ts'
import { createSlots } from './slots.ts'
import { saltOfVerifier } from './verifier-salt.ts'

/** Everything a Hedgerow needs to know; made of the settings by main, by hand in the demo and in tests. */
export interface HedgerowOptions {
  readonly vaultUrl: string
  readonly lobbyUrl: string
  readonly ledgerUrl: string
  /** The directory of the policy files. */
  readonly policies: string
  readonly host: string
  readonly port: number
  readonly pull: { readonly host: string; readonly listen: string; readonly port: number }
  /** PEM texts. */
  readonly tls: { readonly cert: string; readonly key: string } | null
  readonly statementTimeoutMs: number
  /** At least 32 secret bytes, kept outside the ledger's database. */
  readonly key: Uint8Array
  readonly log: Log
  readonly clock: Clock
  readonly random: RandomBytes
  /** For tests and the demo alone: a ledger on a server that may forget in a crash. */
  readonly allowUnsafeLedger?: boolean
  /** How many replies later than their own instant an account may have within a day before it is paused. */
  readonly overrunsADay?: number
}

export interface Hedgerow {
  readonly port: number
  readonly wire: Wire
  policies(): Policies
  /** Reads the policies again, all or nothing; what is wrong is logged and the old ones stay in force. Resolves to whether the new ones are in force. */
  reload(): Promise<boolean>
  close(): Promise<void>
}

/** Policies that cannot be loaded at the start: every complaint, a line each. */
export class PoliciesUnfit extends Error {
  override readonly name = 'PoliciesUnfit'
  readonly complaints: readonly string[]
  constructor(complaints: readonly Complaint[]) {
    const lines = complaints.map(printComplaint)
    super(lines.join('\n'))
    this.complaints = lines
  }
}

const vaultPlaces = 8
const vaultPlacesEach = 4
const overrunsADay = 5
const drainMs = 10_000

/** Starts in the order in which each part needs the others, and undoes what it started where a later part fails. */
export async function startHedgerow(options: HedgerowOptions): Promise<Hedgerow> {
  const { log, clock, random } = options
  const closers: (() => Promise<void>)[] = []
  const secret = (name: string): Buffer => createHmac('sha256', options.key).update(name).digest()
  const close = async (): Promise<void> => {
    for (const each of closers.splice(0).toReversed()) await each().catch(() => log('error', 'serve.close', {}))
  }
  try {
    const vault = await connectVault({ url: options.vaultUrl, statementTimeoutMs: options.statementTimeoutMs, maxConnections: vaultPlaces, log })
    closers.push(() => vault.close())
    const load = async () => loadPolicies(options.policies, (schemas) => vault.session((client) => readCatalog(client, schemas)))
    const first = await load()
    if (first.kind === 'complaints') throw new PoliciesUnfit(first.complaints)
    for (const warning of first.warnings) log('warn', 'policy.warning', { text: printComplaint(warning) })
    let inForce: InForce = { policies: first.value }
    const ledger = await openLedger({ url: options.ledgerUrl, macKey: secret('ledger'), log, allowUnsafe: options.allowUnsafeLedger ?? false })
    closers.push(() => ledger.close())
    const parser = createParser()
    closers.push(() => parser.close())
    const lobby = connectLobby({ lobbyUrl: options.lobbyUrl })
    closers.push(() => lobby.close())
    const describer = createDescriber(lobby, parser)
    const current = (): InForce => inForce
    const answer = createAnswerPull({
      ledger,
      vault,
      lobby,
      parser,
      describer,
      clock,
      random,
      log,
      slots: createSlots(vaultPlaces, vaultPlacesEach),
      statements: createStatementLog(),
      lastAnswers: createLastAnswers(),
      overruns: createOverruns(options.overrunsADay ?? overrunsADay, log),
      deadlineMs: options.statementTimeoutMs,
      inForce: current,
    })
    const password = secret('pull').toString('hex')
    const pulls = await servePulls({
      host: options.pull.listen,
      port: options.pull.port,
      user: 'hedgerow',
      password,
      answer,
      log,
      ceilings: pullCeilings,
      loginTimeoutMs: 10_000,
    })
    closers.push(() => pulls.close())
    const install = async (policies: Policies): Promise<void> => {
      const report = await installLobby({
        lobbyUrl: options.lobbyUrl,
        ledgerUrl: options.ledgerUrl,
        vaultUrl: options.vaultUrl,
        policies,
        pull: { host: options.pull.host, port: pulls.port, password },
      })
      for (const warning of report.warnings) log('warn', 'lobby.warning', { text: warning })
    }
    await install(inForce.policies)
    const gate = createGate({ parser, describer, inForce: current, marker: () => `refused_${randomBytes(8).toString('hex')}_` })
    const address = new URL(options.lobbyUrl)
    const wire = await serveClients({
      host: options.host,
      port: options.port,
      lobby: { host: address.hostname, port: Number(address.port || '5432') },
      tls: options.tls,
      gate,
      log,
      ceilings: wireCeilings,
      loginTimeoutMs: 30_000,
      drainMs,
      saltOf: (user): ScramSalt | null => saltOfVerifier(inForce.policies.analysts.get(user)?.login ?? null),
      decoySecret: secret('decoy'),
    })
    closers.push(() => wire.close())
    let loading: Promise<boolean> = Promise.resolve(true)
    const reload = async (): Promise<boolean> => {
      const next = await load()
      for (const warning of next.warnings) log('warn', 'policy.warning', { text: printComplaint(warning) })
      if (next.kind === 'complaints') {
        for (const complaint of next.complaints) log('error', 'policy.complaint', { text: printComplaint(complaint) })
        return false
      }
      await install(next.value)
      inForce = { policies: next.value }
      log('info', 'policy.in_force', { data_sets: [...next.value.dataSets.keys()].join(', ') })
      return true
    }
    return {
      port: wire.port,
      wire,
      policies: () => inForce.policies,
      reload: () =>
        (loading = loading.then(reload, reload).catch((problem: unknown) => {
          log('error', 'policy.load_failed', { fault: problem instanceof Error ? problem.message : 'unknown' })
          return false
        })),
      close,
    }
  } catch (problem) {
    await close()
    throw problem
  }
}
