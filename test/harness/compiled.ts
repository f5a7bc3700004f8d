import { mkdirSync, readdirSync, readFileSync, writeFileSync } from 'node:fs'
import { dirname, join } from 'node:path'
import { fileURLToPath } from 'node:url'
import ts from 'typescript'

const root = fileURLToPath(new URL('../..', import.meta.url))

/** Writes the folders of src, as JavaScript, below `into`, for a test that needs a process of its own: Node runs no TypeScript. */
export function compileFolders(folders: readonly string[], into: string): void {
  writeFileSync(join(into, 'package.json'), '{ "type": "module" }')
  for (const folder of folders) {
    for (const name of readdirSync(join(root, 'src', folder), { recursive: true, encoding: 'utf8' })) {
      if (!name.endsWith('.ts')) continue
      const target = join(into, 'src', folder, name.replace(/\.ts$/, '.js'))
      mkdirSync(dirname(target), { recursive: true })
      writeFileSync(target, javascript(readFileSync(join(root, 'src', folder, name), 'utf8')))
    }
  }
}

function javascript(source: string): string {
  const compilerOptions = { target: ts.ScriptTarget.ES2023, module: ts.ModuleKind.ESNext, verbatimModuleSyntax: true, rewriteRelativeImportExtensions: true }
  return ts.transpileModule(source, { compilerOptions }).outputText
}
