import { describe, expect, test } from 'vitest'
import { Pipeline } from '../../src/wire/pipeline.ts'

const refusal = { sqlstate: '42501', message: 'rows of people stay closed [rows.private]', hint: '', position: 0 }
const refused = (marker: string) => [{ marker, refusal: { ...refusal, hint: marker } }]

describe('Pipeline', () => {
  test('is idle when each Query, FunctionCall and Sync has its ReadyForQuery', () => {
    const pipeline = new Pipeline()
    expect(pipeline.idle).toBe(true)
    pipeline.statement('Q', false, [])
    pipeline.statement('P', false, [])
    pipeline.sent('B')
    pipeline.sent('E')
    pipeline.sent('S')
    pipeline.sent('F')
    for (let left = 3; left > 0; left -= 1) {
      expect(pipeline.idle).toBe(false)
      pipeline.ready()
    }
    expect(pipeline.idle).toBe(true)
    pipeline.sent('B')
    expect(pipeline.idle).toBe(false)
  })

  test('knows a refusal by its marker until its statement is done with', () => {
    const pipeline = new Pipeline()
    pipeline.statement('Q', true, refused('refused_1_'))
    pipeline.statement('Q', true, refused('refused_11_'))
    expect(pipeline.refusalIn('function hedgerow.refused_1_() does not exist')?.hint).toBe('refused_1_')
    expect(pipeline.refusalIn('function hedgerow.refused_11_() does not exist')?.hint).toBe('refused_11_')
    pipeline.ready()
    expect(pipeline.refusalIn('function hedgerow.refused_1_() does not exist')).toBeNull()
    expect(pipeline.refusalIn('function hedgerow.refused_11_() does not exist')?.hint).toBe('refused_11_')
  })

  test('takes positions for ours in a rewritten statement and in runs of a prepared one, not in others', () => {
    const pipeline = new Pipeline()
    pipeline.statement('Q', false, [])
    pipeline.statement('Q', true, [])
    expect(pipeline.positionIsOurs).toBe(false)
    pipeline.ready()
    expect(pipeline.positionIsOurs).toBe(true)
    pipeline.ready()
    pipeline.statement('P', true, [])
    pipeline.sent('S')
    pipeline.ready()
    pipeline.sent('B')
    pipeline.sent('E')
    pipeline.sent('S')
    expect(pipeline.positionIsOurs).toBe(true)
    pipeline.ready()
    pipeline.statement('Q', false, [])
    expect(pipeline.positionIsOurs).toBe(false)
  })

  test('a Sync that COPY data swallows is not waited for', () => {
    const pipeline = new Pipeline()
    pipeline.statement('P', false, [])
    pipeline.sent('E')
    pipeline.sent('S')
    pipeline.copyIn()
    pipeline.sent('d')
    pipeline.sent('c')
    pipeline.sent('S')
    pipeline.ready()
    expect(pipeline.idle).toBe(true)
  })

  test('a ReadyForQuery too many changes nothing', () => {
    const pipeline = new Pipeline()
    pipeline.ready()
    pipeline.statement('Q', false, [])
    expect(pipeline.idle).toBe(false)
  })
})
