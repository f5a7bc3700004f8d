import { isFields } from './raw.ts'
import type { Json } from './raw.ts'
import type { Name } from './tree.ts'

/** What is known of a raw tree whatever its kind: its depth, and every relation it names anywhere. */
export interface Survey {
  readonly depth: number
  readonly relations: readonly Name[]
}

/** Walks a raw tree of any depth without recursion. A relation is any node with a relname, in the order of the tree, each name once. */
export function survey(tree: Json): Survey {
  const relations = new Map<string, Name>()
  let depth = 0
  const stack: { readonly value: Json; readonly level: number }[] = [{ value: tree, level: 1 }]
  for (let top = stack.pop(); top !== undefined; top = stack.pop()) {
    const { value, level } = top
    if (typeof value !== 'object' || value === null) continue
    depth = Math.max(depth, level)
    const inner = Array.isArray(value) ? (value as readonly Json[]) : Object.values(value)
    for (let index = inner.length - 1; index >= 0; index -= 1) stack.push({ value: inner[index] ?? null, level: level + 1 })
    if (isFields(value) && typeof value['relname'] === 'string') {
      const name = [value['catalogname'], value['schemaname'], value['relname']].filter((part) => typeof part === 'string')
      relations.set(JSON.stringify(name), name)
    }
  }
  return { depth, relations: [...relations.values()] }
}
