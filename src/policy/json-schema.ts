import { z } from 'zod'
import { analystsFile, dataSetFile } from './schema.ts'

/** The two files' JSON Schemas, for editors: kept under `policies/.schema/`. What only the catalogue knows is not in them. */
export const jsonSchemas = {
  'dataset.json': () => printed(dataSetFile),
  'analysts.json': () => printed(analystsFile),
}

function printed(schema: z.ZodType): string {
  return `${JSON.stringify(asWritten(z.toJSONSchema(schema, { io: 'input', unrepresentable: 'any' })), null, 2)}\n`
}

/** Fields as they are written in YAML stand for fields as they are read, and what complaints end in is left out. */
function asWritten(node: unknown): unknown {
  if (Array.isArray(node)) return node.map(asWritten)
  if (typeof node !== 'object' || node === null) return node
  const { json, remedy: _remedy, secret: _secret, ...rest } = node as Readonly<Record<string, unknown>>
  if (typeof json !== 'object' || json === null) return Object.fromEntries(Object.entries(rest).map(([key, value]) => [key, asWritten(value)]))
  return { ...('description' in rest ? { description: rest['description'] } : {}), ...json }
}
