/**
 * How deeply `text` nests round and square brackets, those in strings, quoted names and comments aside. It is a cheap look before the parser's stack is
 * at stake; the tree's own depth is measured after.
 */
export function bracketDepth(text: string): number {
  let depth = 0
  let deepest = 0
  const pieces = /(?<![\w$])[eE]'(?:[^'\\]+|\\[^]|'')*'?|'[^']*'?|"[^"]*"?|--[^\n\r]*|\/\*|\$(?:[A-Za-z_\u0080-\uffff][\w\u0080-\uffff]*)?\$|[([)\]]/g
  for (let piece = pieces.exec(text); piece !== null; piece = pieces.exec(text)) {
    const found = piece[0]
    if (found === '(' || found === '[') {
      depth += 1
      deepest = Math.max(deepest, depth)
    } else if (found === ')' || found === ']') {
      depth -= 1
    } else if (found === '/*') {
      pieces.lastIndex = commentEnd(text, pieces.lastIndex)
    } else if (found.startsWith('$')) {
      const end = text.indexOf(found, pieces.lastIndex)
      pieces.lastIndex = end < 0 ? text.length : end + found.length
    }
  }
  return deepest
}

/** Comments nest. */
function commentEnd(text: string, start: number): number {
  let open = 1
  const marks = /\/\*|\*\//g
  marks.lastIndex = start
  for (let mark = marks.exec(text); mark !== null; mark = marks.exec(text)) {
    open += mark[0] === '/*' ? 1 : -1
    if (open === 0) return marks.lastIndex
  }
  return text.length
}
