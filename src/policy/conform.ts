import { z } from 'zod'
import { Findings } from './complaint.ts'
import type { Outcome } from './complaint.ts'
import { didYouMean } from './near.ts'
import { choices } from './schema.ts'
import type { Path, YamlText } from './yaml-text.ts'

/** Holds a YAML text against a schema: its typed content, or a complaint for every field that does not conform. */
export function conform<T extends z.ZodType>(yaml: YamlText, schema: T): Outcome<z.output<T>> {
  const findings = new Findings()
  const result = schema.safeParse(yaml.value, { reportInput: true })
  if (!result.success) for (const issue of result.error.issues) complain(findings, yaml, schema, issue, [])
  return findings.outcome(() => result.data as z.output<T>)
}

type Issue = z.core.$ZodIssue

function complain(findings: Findings, yaml: YamlText, schema: z.ZodType, issue: Issue, before: Path): void {
  const path: Path = [...before, ...(issue.path as Path)]
  const value = valueAt(yaml.value, path)
  const { field, choice } = fieldAt(schema, yaml.value, path)
  const name = path.length === 0 ? 'the file' : path.join('.')
  const remedy = remedyOf(field)
  switch (issue.code) {
    case 'invalid_union':
      for (const inner of issue.errors[choice?.(value) ?? 0] ?? []) complain(findings, yaml, schema, inner, path)
      return
    case 'unrecognized_keys': {
      const known = keysOf(field)
      for (const key of issue.keys) {
        const place = yaml.keyPlace([...path, key])
        const misplaced = known.length === 1 ? `${remedy}` : didYouMean(key, known, 'remove it')
        findings.complain(place, `${path.length === 0 ? '' : `${name}: `}the key ${key} is not known here`, misplaced)
      }
      return
    }
    case 'invalid_key': {
      const key = path.at(-1) ?? ''
      for (const inner of issue.issues)
        findings.complain(yaml.keyPlace(path), `${path.slice(0, -1).join('.')}: ${key} ${inner.message}`, keyRemedy(schema, yaml.value, path) ?? remedy)
      return
    }
    case 'invalid_type': {
      if (value === undefined) findings.complain(yaml.place(path), `${name} is missing`, remedy)
      else findings.complain(yaml.place(path), `${name} is ${kindOf(value)}, not ${wanted(issue.expected)}`, remedy)
      return
    }
    default: {
      const shown = typeof value === 'string' && field.meta()?.secret !== true ? `${name}: ${value.slice(0, 80)}` : name
      if (value === undefined) findings.complain(yaml.place(path), `${name} is missing`, remedy)
      else findings.complain(yaml.place(path), `${shown} ${issue.message}`, remedy)
    }
  }
}

/** The schema of the value at a path, as far as the path is known; unions are followed by what the value is. */
function fieldAt(schema: z.ZodType, value: unknown, path: Path): { readonly field: z.ZodType; readonly choice: ((value: unknown) => number) | undefined } {
  let field = bare(schema)
  let here = value
  for (const part of path) {
    field = chosen(field, here)
    let next: unknown
    if (field instanceof z.ZodObject) next = field.shape[part]
    else if (field instanceof z.ZodRecord) next = field.valueType
    else if (field instanceof z.ZodArray) next = field.element
    if (!(next instanceof z.ZodType)) break
    field = bare(next)
    here = valueAt(here, [part])
  }
  return { field, choice: choices.get(field) }
}

function chosen(field: z.ZodType, value: unknown): z.ZodType {
  if (!(field instanceof z.ZodUnion)) return field
  const option = field.options[choices.get(field)?.(value) ?? 0]
  return option instanceof z.ZodType ? bare(option) : field
}

/** Without optional and nullable around it. */
function bare(field: z.ZodType): z.ZodType {
  let inner = field
  while (inner instanceof z.ZodOptional || inner instanceof z.ZodNullable) {
    if (inner.meta()?.remedy !== undefined) return inner
    inner = inner.unwrap() as z.ZodType
  }
  return inner
}

function remedyOf(field: z.ZodType): string {
  return field.meta()?.remedy ?? 'see the example policy'
}

function keyRemedy(schema: z.ZodType, value: unknown, path: Path): string | undefined {
  const { field } = fieldAt(schema, value, path.slice(0, -1))
  return field instanceof z.ZodRecord && field.keyType instanceof z.ZodType ? field.keyType.meta()?.remedy : undefined
}

function keysOf(field: z.ZodType): readonly string[] {
  return field instanceof z.ZodObject ? Object.keys(field.shape) : []
}

function valueAt(value: unknown, path: Path): unknown {
  let here = value
  for (const part of path) {
    if (typeof here !== 'object' || here === null || !Object.hasOwn(here, part)) return undefined
    here = (here as Readonly<Record<string | number, unknown>>)[part]
  }
  return here
}

function kindOf(value: unknown): string {
  if (value === null) return 'empty'
  if (typeof value === 'string') return 'a single value'
  return Array.isArray(value) ? 'a list' : 'a mapping'
}

function wanted(expected: string): string {
  if (expected === 'string') return 'a single value'
  return expected === 'array' ? 'a list' : 'a mapping'
}
