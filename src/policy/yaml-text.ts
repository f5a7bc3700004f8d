import { isAlias, isMap, isScalar, isSeq, parseDocument } from 'yaml'
import type { Document, ParsedNode } from 'yaml'
import { Findings } from './complaint.ts'
import type { Outcome, Place } from './complaint.ts'

export type Path = readonly (string | number)[]

/**
 * A YAML file as plain values: mappings, lists, texts and null. Numbers, dates and `true` stay the texts they were written as, so that no amount passes through a double.
 */
export interface YamlText {
  readonly file: string
  readonly value: unknown
  /** The place of the value at a path; of the nearest mapping around it where there is none. */
  readonly place: (path: Path) => Place
  /** The place of the key that leads to a value. */
  readonly keyPlace: (path: Path) => Place
}

/** Bytes of UTF-8; a policy is some kilobytes. */
export const fileCeiling = 262_144
const depthCeiling = 24

const causes: Readonly<Record<string, readonly [message: string, remedy: string]>> = {
  DUPLICATE_KEY: ['this key stands twice in the same mapping', 'keep one of the two'],
  TAB_AS_INDENT: ['a tab is used to indent', 'indent with spaces'],
  BAD_INDENT: ['this line is not indented like its neighbours', 'give the keys of one mapping the same indentation, in spaces'],
  MULTIPLE_DOCS: ['the file holds more than one document', 'remove the `---` line, or write two files'],
  MISSING_CHAR: ['a character is missing here', 'close the bracket, brace or quote, or put a space after the colon'],
  UNEXPECTED_TOKEN: ['this cannot be read here', 'look at the line before it: a quote, a comma or a colon may be missing'],
  BLOCK_AS_IMPLICIT_KEY: ['a mapping stands where a plain value was begun', 'put the inner mapping on lines of its own, indented'],
  MULTILINE_IMPLICIT_KEY: ['a key runs over several lines', 'put the key and its colon on one line'],
  BAD_ALIAS: ['aliases are not used in policies', 'write the value out'],
}

/** Reads YAML 1.2 without aliases, anchors and tags. Every fault of the text is one complaint. */
export function readYaml(text: string, file: string): Outcome<YamlText> {
  const findings = new Findings()
  const start: Place = { file, line: 1, column: 1 }
  if (Buffer.byteLength(text) > fileCeiling) {
    findings.complain(
      start,
      `the file is longer than ${fileCeiling} bytes`,
      'divide it into several data sets, or move long value lists into a published table and use values_from',
    )
    return findings.outcome(() => unreadable(file))
  }
  const placeOf = placesIn(text, file)
  if (deepestNesting(text) > depthCeiling) {
    findings.complain(start, `brackets or lines nest more than ${depthCeiling} deep`, 'a policy needs far fewer levels: check for a missing closing bracket')
    return findings.outcome(() => unreadable(file))
  }
  const document = parseDocument(text, { schema: 'failsafe', prettyErrors: false, logLevel: 'error', strict: true, uniqueKeys: true })
  for (const error of document.errors) {
    const unclosed = error.code === 'BAD_INDENT' && error.message.startsWith('Flow')
    const [message, remedy] = causes[unclosed ? 'MISSING_CHAR' : error.code] ?? [decapitalized(error.message), 'correct the YAML syntax at this place']
    findings.complain(placeOf(error.pos[0]), message, remedy)
  }
  for (const warning of document.warnings) findings.complain(placeOf(warning.pos[0]), 'tags and directives are not used in policies', 'remove it')
  if (!findings.clean) return findings.outcome(() => unreadable(file))
  return collected(document, file, placeOf, findings)
}

function collected(document: Document.Parsed, file: string, placeOf: (offset: number) => Place, findings: Findings): Outcome<YamlText> {
  const values = new Map<string, Place>()
  const keys = new Map<string, Place>()

  const walk = (node: ParsedNode | null, path: Path, fallback: Place): unknown => {
    const place = node === null ? fallback : placeOf(node.range[0])
    values.set(JSON.stringify(path), place)
    if (node === null) return null
    if (isAlias(node) || node.anchor !== undefined) {
      findings.complain(place, 'anchors and aliases are not used in policies', 'write the value out')
      return null
    }
    if (node.tag !== undefined && !/^tag:yaml\.org,2002:(map|seq|str)$/.test(node.tag))
      findings.complain(place, 'tags and directives are not used in policies', 'remove it')
    if (isMap(node)) {
      const mapping: Record<string, unknown> = {}
      for (const pair of node.items) {
        const keyPlace = placeOf(pair.key.range[0])
        const name = isScalar(pair.key) && typeof pair.key.value === 'string' && !pair.key.anchor ? pair.key.value : null
        if (name === null || name === '' || name === '__proto__') {
          findings.complain(keyPlace, 'this cannot be a key', 'use a plain name')
          continue
        }
        keys.set(JSON.stringify([...path, name]), keyPlace)
        mapping[name] = walk(pair.value, [...path, name], keyPlace)
      }
      return mapping
    }
    if (isSeq(node)) return node.items.map((item, index) => walk(item as ParsedNode, [...path, index], place))
    if (isScalar(node)) {
      const written = typeof node.value === 'string' ? node.value : ''
      if (written.includes('\0')) findings.complain(place, 'a text holds a NUL character', 'PostgreSQL has none in its texts: remove it')
      return node.type === 'PLAIN' && /^(~|null|Null|NULL|)$/.test(written) ? null : written
    }
    return null
  }

  const value = walk(document.contents, [], { file, line: 1, column: 1 })
  const place = (path: Path): Place => {
    for (let length = path.length; length > 0; length--) {
      const found = values.get(JSON.stringify(path.slice(0, length)))
      if (found !== undefined) return found
    }
    return values.get('[]') ?? { file, line: 1, column: 1 }
  }
  return findings.outcome(() => ({ file, value, place, keyPlace: (path: Path) => keys.get(JSON.stringify(path)) ?? place(path) }))
}

/** Turns offsets into places, by halving the list of line starts. */
function placesIn(text: string, file: string): (offset: number) => Place {
  const starts = [0]
  for (let end = text.indexOf('\n'); end !== -1; end = text.indexOf('\n', end + 1)) starts.push(end + 1)
  return (offset) => {
    let [low, high] = [0, starts.length]
    while (high - low > 1) {
      const middle = (low + high) >> 1
      if ((starts[middle] ?? 0) <= offset) low = middle
      else high = middle
    }
    return { file, line: low + 1, column: offset - (starts[low] ?? 0) + 1 }
  }
}

/** An upper bound on the depth of nesting that needs no recursion: brackets open at once, and distinct indentations open at once. */
function deepestNesting(text: string): number {
  let brackets = 0
  let deepest = 0
  const indents: number[] = []
  for (const line of text.split('\n')) {
    const body = line.trimStart()
    if (body === '' || body.startsWith('#')) continue
    const indent = line.length - body.length
    while (indents.length > 0 && (indents.at(-1) ?? 0) >= indent) indents.pop()
    indents.push(indent)
    const dashes =
      /^(- +|-$|\? +)*/
        .exec(body)?.[0]
        .split(' ')
        .filter((word) => word !== '').length ?? 0
    for (const character of body) {
      if (character === '[' || character === '{') brackets++
      else if ((character === ']' || character === '}') && brackets > 0) brackets--
      deepest = Math.max(deepest, brackets + indents.length + dashes)
    }
  }
  return deepest
}

function unreadable(file: string): YamlText {
  const place = (): Place => ({ file, line: 1, column: 1 })
  return { file, value: null, place, keyPlace: place }
}

function decapitalized(message: string): string {
  return (message.charAt(0).toLowerCase() + message.slice(1)).replace(/\.$/, '')
}
