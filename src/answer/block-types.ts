import { check } from '../base/check.ts'
import { refuse } from '../base/refusal.ts'
import { printedParameter, type ScalarType } from '../catalog/scalar-type.ts'
import { enumType } from '../plan/lower-type.ts'
import type { BlockTypes } from '../plan/rewrite.ts'
import type { DataSet } from '../policy/data-set.ts'
import type { Parser } from '../sql/parser.ts'
import type { TypeRef } from '../sql/tree.ts'
import type { Described, Lobby } from './ports.ts'

export type BlockDescription =
  | { readonly kind: 'described'; readonly types: BlockTypes; readonly parameters: readonly ScalarType[] }
  | Extract<Described, { kind: 'complaint' }>

/** Describes texts in the lobby, once each: what PostgreSQL itself says of their parameters and columns. */
export interface Describer {
  block(dataSet: DataSet, text: string, parameterTypes: readonly number[]): Promise<BlockDescription>
  /** PostgreSQL's complaint about a whole statement, or null where it has none. */
  complaint(dataSet: DataSet, text: string, parameterTypes: readonly number[]): Promise<boolean>
}

const kept = 2000

export function createDescriber(lobby: Lobby, parser: Parser): Describer {
  const blocks = new Map<string, BlockDescription>()
  const refs = new Map<string, TypeRef>()

  async function typeRef(printed: string): Promise<TypeRef> {
    const known = refs.get(printed)
    if (known !== undefined) return known
    const outcome = await parser.readText(`SELECT NULL::${printed}`)
    const statement = outcome.kind === 'read' ? outcome.statements[0]?.statement : undefined
    const value = statement?.kind === 'query' && statement.query.body.kind === 'select' ? statement.query.body.targets[0]?.value : undefined
    check(value?.kind === 'cast', 'a printed type can be read again')
    refs.set(printed, value.type)
    return value.type
  }

  async function describe(dataSet: DataSet, text: string, parameterTypes: readonly number[]): Promise<BlockDescription> {
    const described = await lobby.describe(dataSet.name, text, parameterTypes)
    if (described.kind === 'complaint') return described
    const parameters = described.parameters.map((printed) => parameterType(printed, dataSet))
    const columns = await Promise.all(described.columns.map(async (column) => ({ name: column.name, type: await typeRef(column.type) })))
    const types = { parameters: await Promise.all(described.parameters.map(typeRef)), columns }
    return { kind: 'described', types, parameters }
  }

  return {
    block: async (dataSet, text, parameterTypes) => {
      const key = JSON.stringify([dataSet.name, dataSet.policyHash, text, parameterTypes])
      const known = blocks.get(key)
      if (known !== undefined) return known
      const description = await describe(dataSet, text, parameterTypes)
      const [oldest] = blocks.keys()
      if (blocks.size >= kept && oldest !== undefined) blocks.delete(oldest)
      blocks.set(key, description)
      return description
    },
    complaint: async (dataSet, text, parameterTypes) => {
      const described = await lobby.describe(dataSet.name, text, parameterTypes)
      return described.kind === 'complaint' && /^(42|22|0A)/.test(described.sqlstate) && described.sqlstate !== '42501'
    },
  }
}

function parameterType(printed: string, dataSet: DataSet): ScalarType {
  const known = printedParameter(printed) ?? enumType(dataSet, (type) => type.printed === printed || type.name === printed)
  return known ?? refuse('expr.unsupported', { what: `a parameter of type ${printed}` })
}
