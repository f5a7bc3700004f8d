import { isFields } from './raw.ts'
import type { Json } from './raw.ts'
import type { Name } from './tree.ts'

/** Every relation that a raw tree names anywhere, in the order of the tree, each name once: whatever node has a relname. */
export function relationsOf(tree: Json): readonly Name[] {
  const relations = new Map<string, Name>()
  const visit = (value: Json): void => {
    if (typeof value !== 'object' || value === null) return
    if (isFields(value) && typeof value['relname'] === 'string') {
      const name = [value['catalogname'], value['schemaname'], value['relname']].filter((part) => typeof part === 'string')
      relations.set(JSON.stringify(name), name)
    }
    for (const inner of Array.isArray(value) ? (value as readonly Json[]) : Object.values(value)) visit(inner)
  }
  visit(tree)
  return [...relations.values()]
}
