import { isDeepStrictEqual } from 'node:util'
import { isMap, isScalar, parseDocument } from 'yaml'
import type { YAMLMap } from 'yaml'
import { nearest } from '../policy/near.ts'
import { readYaml } from '../policy/yaml-text.ts'

export type LoginEdit = { readonly kind: 'edited'; readonly text: string } | { readonly kind: 'refused'; readonly message: string }

/**
 * The analysts' file with one analyst's `login` set, every other byte as it was: only the value's own stretch of text is exchanged, or a line for it
 * put in. The result is read again and must say what the old text said, login aside.
 */
export function setLogin(text: string, file: string, analyst: string, verifier: string): LoginEdit {
  const before = readYaml(text, file)
  if (before.kind === 'complaints') {
    const [first] = before.complaints
    return { kind: 'refused', message: `${file}:${first?.line ?? 1}:${first?.column ?? 1}: ${first?.message ?? 'the file cannot be read'}` }
  }
  const document = parseDocument(text, { schema: 'failsafe', logLevel: 'silent' })
  const analysts = document.get('analysts')
  if (!isMap(analysts) || !analysts.has(analyst)) {
    const near = nearest(analyst, isMap(analysts) ? analysts.items.map(({ key }) => (isScalar(key) ? String(key.value) : '')) : [])
    return { kind: 'refused', message: `${file} lists no analyst ${analyst}${near === null ? ': add one with data first' : `: did you mean ${near}?`}` }
  }
  const edited = withLogin(text, analysts, analyst, JSON.stringify(verifier))
  const after = edited === null ? null : readYaml(edited, file)
  if (edited === null || after?.kind !== 'fits' || !isDeepStrictEqual(after.value.value, expected(before.value.value, analyst, verifier)))
    return { kind: 'refused', message: `${file}: the login of ${analyst} cannot be set in this layout; write it by hand as login: ${JSON.stringify(verifier)}` }
  return { kind: 'edited', text: edited }
}

function withLogin(text: string, analysts: YAMLMap, analyst: string, quoted: string): string | null {
  const entry = analysts.get(analyst, true)
  if (isScalar(entry) && entry.range) return exchanged(text, entry.range, `{ login: ${quoted} }`)
  if (!isMap(entry) || !entry.range) return null
  const login = entry.get('login', true)
  if (isScalar(login) && login.range) return exchanged(text, login.range, quoted)
  if (login !== undefined && login !== null) return null
  const start = entry.range[0]
  if (entry.flow === true) return `${text.slice(0, start + 1)} login: ${quoted}${entry.items.length === 0 ? ' ' : ','}${text.slice(start + 1)}`
  const lineStart = text.lastIndexOf('\n', start - 1) + 1
  return `${text.slice(0, start)}login: ${quoted}\n${text.slice(lineStart, start)}${text.slice(start)}`
}

function exchanged(text: string, range: readonly [number, number, number], replacement: string): string {
  const space = /\s/.test(text.charAt(range[0] - 1)) ? '' : ' '
  const lineEnd = text.slice(range[0], range[1]).endsWith('\n') ? '\n' : ''
  return `${text.slice(0, range[0])}${space}${replacement}${lineEnd}${text.slice(range[1])}`
}

function expected(value: unknown, analyst: string, login: string): unknown {
  const file = value as { readonly analysts: Readonly<Record<string, object | null>> }
  return { ...file, analysts: { ...file.analysts, [analyst]: { ...file.analysts[analyst], login } } }
}
