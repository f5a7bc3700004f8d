/** A text with one or more places marked by ▸: the text without the marks, and the places as `line:column`, from 1. */
export function marked(text: string): { readonly text: string; readonly places: readonly string[] } {
  const places: string[] = []
  let clean = ''
  for (const [index, part] of text.split('▸').entries()) {
    if (index > 0) {
      const lines = clean.split('\n')
      places.push(`${lines.length}:${(lines.at(-1)?.length ?? 0) + 1}`)
    }
    clean += part
  }
  return { text: clean, places }
}

/** `text` with its one occurrence of `from` exchanged. */
export function exchanged(text: string, from: string, to: string): string {
  const parts = text.split(from)
  if (parts.length !== 2) throw new Error(`${from} occurs ${parts.length - 1} times`)
  return parts.join(to)
}
