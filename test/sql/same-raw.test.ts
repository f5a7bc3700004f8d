import { describe, expect, test } from 'vitest'
import { sameRaw } from '../../src/sql/echo.ts'

describe('the echo check', () => {
  const tree = { SelectStmt: { targetList: [{ ResTarget: { val: { A_Const: { ival: { ival: 1 }, location: 7 } }, location: 7 } }], op: 'SETOP_NONE' } }

  test('does not look at places', () => {
    const elsewhere = { SelectStmt: { targetList: [{ ResTarget: { val: { A_Const: { ival: { ival: 1 }, location: 70 } } } }], op: 'SETOP_NONE', stmt_len: 4 } }
    expect(sameRaw(tree, elsewhere)).toBe(true)
  })

  const different = {
    'another number': { SelectStmt: { targetList: [{ ResTarget: { val: { A_Const: { ival: { ival: 2 } } } } }], op: 'SETOP_NONE' } },
    'a number as a text': { SelectStmt: { targetList: [{ ResTarget: { val: { A_Const: { ival: { ival: '1' } } } } }], op: 'SETOP_NONE' } },
    'another word': { SelectStmt: { targetList: [{ ResTarget: { val: { A_Const: { ival: { ival: 1 } } } } }], op: 'SETOP_UNION' } },
    'a field more': { SelectStmt: { targetList: [{ ResTarget: { val: { A_Const: { ival: { ival: 1 } } } } }], op: 'SETOP_NONE', all: true } },
    'a field less': { SelectStmt: { targetList: [{ ResTarget: { val: { A_Const: { ival: { ival: 1 } } } } }] } },
    'an item more': { SelectStmt: { targetList: [{ ResTarget: { val: { A_Const: { ival: { ival: 1 } } } } }, {}], op: 'SETOP_NONE' } },
    'a field of another name': { SelectStmt: { targetList: [{ ResTarget: { val: { A_Const: { fval: { ival: 1 } } } } }], op: 'SETOP_NONE' } },
    'a list for a record': { SelectStmt: [] },
    'a place that is no number': { SelectStmt: { targetList: [{ ResTarget: { val: { A_Const: { ival: { ival: 1 }, location: 'x' } } } }], op: 'SETOP_NONE' } },
  }
  test.each(Object.entries(different))('sees %s', (_, other) => {
    expect(sameRaw(tree, other)).toBe(false)
    expect(sameRaw(other, tree)).toBe(false)
  })
})
