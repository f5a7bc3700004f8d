import { existsSync, readFileSync } from 'node:fs'
import { describe, expect, test } from 'vitest'
import { parse } from 'yaml'
import { readSettings, settingRows } from '../../src/settings.ts'

interface Service {
  readonly image?: string
  readonly build?: { readonly dockerfile_inline: string }
  readonly environment: Readonly<Record<string, string>>
  readonly networks: readonly string[]
  readonly ports?: readonly string[]
  readonly healthcheck?: unknown
  readonly depends_on?: Readonly<Record<string, unknown>>
  readonly configs?: readonly { readonly source: string }[]
  readonly volumes?: readonly string[]
}

interface Compose {
  readonly services: Readonly<Record<'vault' | 'lobby' | 'hedgerow' | 'ferries', Service>>
  readonly networks: Readonly<Record<string, { readonly internal?: boolean }>>
  readonly volumes: Readonly<Record<string, unknown>>
  readonly configs: Readonly<Record<string, unknown>>
}

const root = new URL('../../', import.meta.url)
const text = readFileSync(new URL('docker-compose.yml', root), 'utf8')
const compose = parse(text, { merge: true }) as Compose
const { vault, lobby, hedgerow } = compose.services
const known = settingRows.map(({ name }) => name as string)

describe('docker-compose.yml', () => {
  test('names no setting that Hedgerow does not read', () => {
    const named = [...new Set(text.match(/HEDGEROW_\w+/g))]
    expect(named.length).toBeGreaterThan(5)
    expect(named.filter((name) => !known.includes(name))).toEqual([])
  })

  test('gives Hedgerow settings that it accepts, with the passwords filled in', () => {
    const filled = Object.fromEntries(Object.entries(hedgerow.environment).map(([name, value]) => [name, value.replace(/\$\{\w+:\?[^}]*\}/g, 'harbour')]))
    const settings = readSettings(filled)
    expect(new URL(settings.vaultUrl ?? '').hostname).toBe('vault')
    expect(new URL(settings.lobbyUrl ?? '').hostname).toBe('lobby')
    expect([settings.host, settings.pullHost]).toEqual(['0.0.0.0', 'hedgerow'])
    expect(hedgerow.ports).toEqual([`127.0.0.1:${settings.port}:${settings.port}`])
    expect(settings.pullPort).not.toBe(settings.port)
  })

  test('lets the lobby reach Hedgerow but not the vault, and nobody outside reach either', () => {
    expect(vault.networks.filter((network) => lobby.networks.includes(network))).toEqual([])
    for (const server of [vault, lobby]) {
      expect(server.networks.some((network) => hedgerow.networks.includes(network))).toBe(true)
      expect(server.networks.every((network) => compose.networks[network]?.internal === true)).toBe(true)
      expect(server.ports).toBeUndefined()
    }
  })

  test('holds no password: each comes from the environment, and must be there', () => {
    for (const { environment } of Object.values(compose.services)) {
      for (const [name, value] of Object.entries(environment)) {
        if (name.endsWith('PASSWORD')) expect(value).toMatch(/^\$\{\w+:\?[^}]+\}$/)
        if (name.endsWith('URL')) expect(value).toMatch(/^postgresql:\/\/\w+:\$\{\w+:\?[^}]+\}@/)
      }
    }
  })

  test('never lets a server trust a connection', () => {
    for (const { environment } of [vault, lobby]) {
      expect(environment['POSTGRES_HOST_AUTH_METHOD']).toBe('scram-sha-256')
      expect(environment['POSTGRES_INITDB_ARGS']).toBe('--auth=scram-sha-256')
    }
  })

  test('waits for healthy servers', () => {
    for (const service of [vault, lobby, hedgerow]) expect(service.healthcheck).toBeDefined()
    expect(Object.keys(hedgerow.depends_on ?? {}).toSorted()).toEqual(['ferries', 'lobby', 'vault'])
  })

  test('builds its image from files that are there, and runs it as an ordinary account', () => {
    const lines = (hedgerow.build?.dockerfile_inline ?? '').split('\n').map((line) => line.trim())
    const copied = lines.filter((line) => line.startsWith('COPY ') && !line.includes('--from=')).flatMap((line) => line.split(/\s+/).slice(1, -1))
    expect(copied).toContain('package-lock.json')
    expect(copied.filter((path) => !existsSync(new URL(path, root)))).toEqual([])
    expect(lines.filter((line) => line.startsWith('FROM ')).every((line) => /^FROM node:20-/.test(line))).toBe(true)
    expect(lines.findLast((line) => line.startsWith('USER '))).toBe('USER node')
    expect(lines.at(-1) || lines.at(-2)).toBe('CMD ["node", "dist/main.js"]')
  })

  test('defines every network, volume and configuration that it uses', () => {
    for (const service of Object.values(compose.services)) {
      for (const network of service.networks) expect(Object.keys(compose.networks)).toContain(network)
      for (const { source } of service.configs ?? []) expect(Object.keys(compose.configs)).toContain(source)
      for (const volume of service.volumes ?? []) if (/^\w/.test(volume)) expect(Object.keys(compose.volumes)).toContain(volume.split(':')[0])
    }
  })
})
