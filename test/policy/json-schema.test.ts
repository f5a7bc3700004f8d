import { readFile } from 'node:fs/promises'
import { describe, expect, test } from 'vitest'
import { jsonSchemas } from '../../src/policy/json-schema.ts'

describe('the JSON Schemas for editors', () => {
  test.each(Object.entries(jsonSchemas))(
    '%s is what the reader accepts (after a change: npx vitest run test/policy/json-schema.test.ts -u)',
    async (name, make) => {
      await expect(make()).toMatchFileSnapshot(`../../policies/.schema/${name}`)
    },
  )

  test('amounts are numbers to whoever writes them, and unknown keys are refused', () => {
    const schema = JSON.parse(jsonSchemas['dataset.json']()) as {
      additionalProperties: boolean
      properties: { defaults: { properties: Record<string, unknown> } }
    }
    expect(schema.additionalProperties).toBe(false)
    expect(schema.properties.defaults.properties['epsilon']).toMatchObject({ type: 'number', exclusiveMinimum: 0 })
    expect(jsonSchemas['dataset.json']()).not.toContain('"remedy"')
  })

  test.each(['ferries.yaml', 'analysts.yaml'])('%s names its schema', async (name) => {
    const text = await readFile(new URL(`../../policies/${name}`, import.meta.url), 'utf8')
    const [, path = ''] = /^# yaml-language-server: \$schema=(\S+)/.exec(text) ?? []
    expect(await readFile(new URL(`../../policies/${path}`, import.meta.url), 'utf8')).toContain('"$schema"')
  })
})
