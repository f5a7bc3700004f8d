import { randomBytes } from 'node:crypto'
import { errorCode, policyTexts } from '../files/policy-texts.ts'
import { replaceFile } from '../files/replace-file.ts'
import { Findings, printComplaint } from '../policy/complaint.ts'
import { isAnalystsText } from '../policy/read.ts'
import { askHidden, readLine } from './ask.ts'
import type { Terminal } from './ask.ts'
import { isShort, preparedPassword } from './prepared-password.ts'
import { scramVerifier } from './scram.ts'
import { setLogin } from './set-login.ts'

const saltBytes = 16

/**
 * `hedgerow password NAME`: asks twice on a terminal, or reads one line from a pipe, and writes the verifier into the file of analysts. The password itself is
 * kept nowhere. Returns the exit code; `say` is given lines for people.
 */
export async function password(directory: string, analyst: string, terminal: Terminal, say: (line: string) => void): Promise<0 | 1> {
  const found = await analystsText(directory, say)
  if (found === null) return 1
  const rehearsal = setLogin(found.text, found.file, analyst, '')
  if (rehearsal.kind === 'refused') return failed(say, rehearsal.message)
  const typed = await typedPassword(terminal, analyst, say)
  if (typed === null) return 1
  const prepared = preparedPassword(typed)
  if (prepared.kind === 'unfit') return failed(say, prepared.why)
  const edit = setLogin(found.text, found.file, analyst, await scramVerifier(prepared.password, randomBytes(saltBytes)))
  if (edit.kind === 'refused') return failed(say, edit.message)
  try {
    await replaceFile(found.file, edit.text)
  } catch (error) {
    return failed(say, `${found.file} cannot be written (${errorCode(error)})`)
  }
  if (isShort(prepared.password)) say('warning: the password is short; whoever reads the file can guess it')
  say(`the login of ${analyst} is set in ${found.file}; a running hedgerow takes it up by itself`)
  return 0
}

async function analystsText(directory: string, say: (line: string) => void): Promise<{ readonly file: string; readonly text: string } | null> {
  const findings = new Findings()
  const texts = (await policyTexts(directory, findings)).filter(({ text }) => isAnalystsText(text))
  const outcome = findings.outcome(() => texts[0])
  if (outcome.kind === 'complaints') for (const complaint of outcome.complaints) say(printComplaint(complaint))
  else if (outcome.value === undefined) say(`${directory} holds no file of analysts: write analysts.yaml, with analysts and everyone`)
  return outcome.kind === 'fits' ? (outcome.value ?? null) : null
}

async function typedPassword(terminal: Terminal, analyst: string, say: (line: string) => void): Promise<string | null> {
  if (terminal.input.isTTY !== true) {
    const line = await readLine(terminal.input)
    if (line === null) say('no password was read: give it as one line of UTF-8, at most 4096 bytes long')
    return line
  }
  const first = await askHidden(terminal, `password for ${analyst}: `)
  if (first === null) return null
  const second = await askHidden(terminal, 'the same again: ')
  if (second === null) return null
  if (first === second) return first
  say('the two are not the same: nothing is changed')
  return null
}

function failed(say: (line: string) => void, message: string): 1 {
  say(message)
  return 1
}
