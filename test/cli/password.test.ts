import { mkdtemp, readFile, readdir, rm, stat, symlink, writeFile, chmod } from 'node:fs/promises'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { PassThrough } from 'node:stream'
import pg from 'pg'
import { afterAll, afterEach, beforeAll, beforeEach, describe, expect, test } from 'vitest'
import type { Terminal } from '../../src/cli/ask.ts'
import { password } from '../../src/cli/password.ts'
import { isShort, preparedPassword } from '../../src/cli/prepared-password.ts'
import { scramVerifier } from '../../src/cli/scram.ts'
import { setLogin } from '../../src/cli/set-login.ts'
import { readAnalystsFile } from '../../src/policy/read.ts'
import { isVerifier } from '../../src/policy/verifier.ts'
import { testServer } from '../harness/server.ts'
import type { TestServer } from '../harness/server.ts'

const analysts = `# kept
analysts:
  ana:   # the first
    login: null     # none yet
    data: { ferries: { epsilon: 4, delta: 1e-6 } }


  ben: { data: {} }
everyone:
    ferries: {epsilon:   12, delta: 1e-5}   # odd layout
`

let directory: string

beforeEach(async () => {
  directory = await mkdtemp(join(tmpdir(), 'password-'))
  await writeFile(join(directory, 'analysts.yaml'), analysts)
})
afterEach(async () => {
  await rm(directory, { recursive: true, force: true })
})

function piped(...chunks: readonly (string | Uint8Array)[]): Terminal {
  const input = new PassThrough()
  for (const chunk of chunks) input.write(chunk)
  input.end()
  return { input, output: new PassThrough() }
}

async function saying(run: (say: (line: string) => void) => Promise<number>): Promise<{ readonly code: number; readonly lines: readonly string[] }> {
  const lines: string[] = []
  return { code: await run((line) => lines.push(line)), lines }
}

async function loginOf(analyst: string): Promise<string | null | undefined> {
  const outcome = readAnalystsFile(await readFile(join(directory, 'analysts.yaml'), 'utf8'), 'analysts.yaml')
  return outcome.kind === 'fits' ? outcome.value.content.analysts[analyst]?.login : undefined
}

describe('hedgerow password', () => {
  let server: TestServer
  beforeAll(async () => {
    server = await testServer()
  })
  afterAll(() => server.stop())

  test.each(['harbour lights', 'quote\'"\\$ back', 'pier\u00a0ſeven ⅷ', 'Überfähre'])(
    'PostgreSQL takes the verifier, and lets its password in: %s',
    async (typed) => {
      const { code } = await saying((say) => password(directory, 'ana', piped(`${typed}\r\n`), say))
      expect(code).toBe(0)
      const verifier = (await loginOf('ana')) ?? ''
      const role = server.uniqueName('ana')
      const admin = new pg.Client({ connectionString: server.url() })
      await admin.connect()
      try {
        await admin.query(`CREATE ROLE ${role} LOGIN PASSWORD ${pg.escapeLiteral(verifier)}`)
        const kept = await admin.query<{ rolpassword: string }>('SELECT rolpassword FROM pg_authid WHERE rolname = $1', [role])
        expect(kept.rows).toEqual([{ rolpassword: verifier }])
        const as = (given: string) => new pg.Client({ host: server.host, port: server.port, user: role, password: given, database: 'postgres' })
        const client = as(typed.normalize('NFKC'))
        await client.connect()
        await client.end()
        await expect(as(`${typed}x`).connect()).rejects.toMatchObject({ code: '28P01' })
      } finally {
        await admin.query(`DROP ROLE IF EXISTS ${role}`)
        await admin.end()
      }
    },
  )

  test('changes the login alone: comments, layout, mode and links stay', async () => {
    await chmod(join(directory, 'analysts.yaml'), 0o640)
    await symlink(join(directory, 'analysts.yaml'), join(directory, 'link.txt'))
    expect((await saying((say) => password(directory, 'ana', piped('lantern room\n'), say))).code).toBe(0)
    const text = await readFile(join(directory, 'analysts.yaml'), 'utf8')
    expect(text.replace(/"SCRAM-SHA-256\$[^"]*"/, 'null')).toBe(analysts)
    expect((await stat(join(directory, 'analysts.yaml'))).mode & 0o777).toBe(0o640)
    expect(await readdir(directory)).toEqual(['analysts.yaml', 'link.txt'])
  })

  test('says that a short password is short, and sets it', async () => {
    const { code, lines } = await saying((say) => password(directory, 'ben', piped('gulls'), say))
    expect([code, lines[0]]).toEqual([0, 'warning: the password is short; whoever reads the file can guess it'])
    expect(isVerifier((await loginOf('ben')) ?? '')).toBe(true)
  })

  test.each([
    ['nobody by that name', 'anna', ['lantern room'], /lists no analyst anna: did you mean ana\?$/],
    ['no line', 'ana', [], /^no password was read/],
    ['an endless line', 'ana', ['x'.repeat(5000)], /^no password was read/],
    ['invalid UTF-8', 'ana', [new Uint8Array([0xff, 0x0a])], /^no password was read/],
    ['a control character', 'ana', ['a\u0007b\n'], /control character/],
    ['an endless password', 'ana', ['x'.repeat(600)], /longer than 512/],
  ] as const)('changes nothing for %s', async (_title, analyst, chunks, message) => {
    const { code, lines } = await saying((say) => password(directory, analyst, piped(...chunks), say))
    expect([code, lines.length]).toEqual([1, 1])
    expect(lines[0]).toMatch(message)
    expect(await readFile(join(directory, 'analysts.yaml'), 'utf8')).toBe(analysts)
  })

  test('says where the file is broken, and that there is none', async () => {
    await writeFile(join(directory, 'analysts.yaml'), 'analysts:\n  ana: {\n')
    expect((await saying((say) => password(directory, 'ana', piped('lantern room'), say))).lines[0]).toMatch(/analysts\.yaml:3:1: a character is missing here$/)
    await rm(join(directory, 'analysts.yaml'))
    expect((await saying((say) => password(directory, 'ana', piped('lantern room'), say))).lines[0]).toMatch(/holds no file of analysts/)
  })

  test.each([
    ['the same', ['lantern room', 'lantern room'], 0],
    ['not the same', ['lantern room', 'lantern rome'], 1],
  ] as const)('asks twice on a terminal and shows nothing of it: %s', async (_title, answers, exit) => {
    const input = Object.assign(new PassThrough(), { isTTY: true })
    const output = new PassThrough()
    let shown = ''
    const queue = [...answers]
    output.on('data', (chunk: Buffer) => {
      shown += chunk.toString()
      if (/: $/.test(chunk.toString())) setTimeout(() => input.write(`${queue.shift() ?? ''}\r`), 5)
    })
    const { code } = await saying((say) => password(directory, 'ana', { input, output }, say))
    expect([code, shown]).toEqual([exit, 'password for ana: \nthe same again: \n'])
    expect(typeof (await loginOf('ana'))).toBe(exit === 0 ? 'string' : 'object')
  })

  test('Ctrl-C breaks it off', async () => {
    const input = Object.assign(new PassThrough(), { isTTY: true })
    setTimeout(() => input.write('lant\u0003'), 5)
    expect((await saying((say) => password(directory, 'ana', { input, output: new PassThrough() }, say))).code).toBe(1)
    expect(await readFile(join(directory, 'analysts.yaml'), 'utf8')).toBe(analysts)
  })
})

describe('setting a login in the text', () => {
  const v = 'SCRAM-SHA-256$4096:c2FsdA==$x:y'
  test.each([
    ['analysts:\n  ana:\n    login: old # mine\n', `analysts:\n  ana:\n    login: "${v}" # mine\n`],
    ['analysts:\n  ana:\n    login: >-\n      old\n    data: {}\n', `analysts:\n  ana:\n    login: "${v}"\n    data: {}\n`],
    ['analysts:\n  ana:\n    login:\n    data: {}\n', `analysts:\n  ana:\n    login: "${v}"\n    data: {}\n`],
    ['analysts:\n  ana:\n    data: {}\n', `analysts:\n  ana:\n    login: "${v}"\n    data: {}\n`],
    ['analysts:\n  ana: { data: {} }\n', `analysts:\n  ana: { login: "${v}", data: {} }\n`],
    ['analysts: {ana: {}, ben: {}}\n', `analysts: {ana: { login: "${v}" }, ben: {}}\n`],
    ['analysts:\n  ana:\n  ben: {}\n', `analysts:\n  ana: { login: "${v}" }\n  ben: {}\n`],
    ['analysts:\r\n  ana:\r\n    login: "old"\r\n', `analysts:\r\n  ana:\r\n    login: "${v}"\r\n`],
  ])('%j', (text, expected) => {
    expect(setLogin(text, 'analysts.yaml', 'ana', v)).toEqual({ kind: 'edited', text: expected })
  })

  test.each(['analysts:\n  ana: &a {}\n', 'analysts:\n  ana: [x]\n', 'analysts:\n  ana:\n    login: [x]\n', 'analysts: [ana]\n'])(
    'is refused rather than guessed at: %j',
    (text) => {
      expect(setLogin(text, 'analysts.yaml', 'ana', v).kind).toBe('refused')
    },
  )
})

describe('preparing a password', () => {
  test.each([
    ['I\u00adX', 'IX'],
    ['user', 'user'],
    ['USER', 'USER'],
    ['\u00aa', 'a'],
    ['\u2168', 'IX'],
    ['\u0007', null],
    ['\u0627\u0031', '\u0627\u0031'],
    ['\u0627\ufdfa', null],
    ['\u00ad', null],
  ])('%j → %j (the examples of RFC 4013, section 3, and some more)', (typed, expected) => {
    const prepared = preparedPassword(typed)
    expect(prepared.kind === 'prepared' ? prepared.password : null).toBe(expected)
  })

  test('counts characters, not bytes', () => {
    expect([isShort('fährboot'), isShort('fähren')]).toEqual([false, true])
  })

  test('the verifier is that of RFC 7677, section 3 (password pencil)', async () => {
    // ServerSignature and ClientProof of the exchange printed there follow from these two keys.
    const { createHmac, createHash } = await import('node:crypto')
    const verifier = await scramVerifier('pencil', Buffer.from('W22ZaJ0SNY7soEsUEjb6gQ==', 'base64'), 4096)
    const [, stored = '', server = ''] = /\$([^$:]+):([^:]+)$/.exec(verifier) ?? []
    const exchange =
      'n=user,r=rOprNGfwEbeRWgbNEkqO,r=rOprNGfwEbeRWgbNEkqO%hvYDpWUa2RaTCAfuxFIlj)hNlF$k0,s=W22ZaJ0SNY7soEsUEjb6gQ==,i=4096,c=biws,r=rOprNGfwEbeRWgbNEkqO%hvYDpWUa2RaTCAfuxFIlj)hNlF$k0'
    expect(createHmac('sha256', Buffer.from(server, 'base64')).update(exchange).digest('base64')).toBe('6rriTRBi23WpRR/wtup+mMhUZUn/dB5nLTJRsjl95G4=')
    const proof = Buffer.from('dHzbZapWIk4jUhN+Ute9ytag9zjfMHgsqmmiz7AndVQ=', 'base64')
    const signature = createHmac('sha256', Buffer.from(stored, 'base64')).update(exchange).digest()
    const clientKey = proof.map((byte, index) => byte ^ (signature[index] ?? 0))
    expect(createHash('sha256').update(clientKey).digest('base64')).toBe(stored)
  })
})
