/** The layers in their order: a file imports its own and earlier ones. Everything before the edges is pure. */
const pure = ['base', 'sql', 'catalog', 'policy', 'plan', 'bound', 'noise', 'budget', 'release', 'answer']
/** The folders that touch sockets, files and databases. They meet in main and in the demo, nowhere else. */
const edges = ['vault', 'lobby', 'ledger', 'wire', 'admin', 'embedded', 'files']
/** What joins the edges: nothing imports it. */
const joints = ['cli', 'demo', 'serve']

const below = (folders) => `^src/(${folders.join('|')})/`
const entries = '^src/(main|cli)\\.ts$|^src/demo/main\\.ts$'

/** Node's modules that a pure layer may use: hashing, and the worker threads that the grammar must live in. */
const builtIns = {
  base: ['crypto'],
  policy: ['crypto'],
  release: ['crypto'],
  noise: ['crypto'],
  plan: ['crypto'],
  answer: ['crypto'],
  sql: ['worker_threads', 'url', 'module', 'crypto'],
}
/** Packages, and the only folders that may use them. */
const packages = { 'libpg-query': ['sql'], pg: ['vault', 'lobby', 'ledger', 'demo', 'serve'], yaml: ['policy', 'cli'], zod: ['policy', 'wire'] }

const order = pure.map((layer, index) => ({
  name: `order-${layer}`,
  comment: `${layer} may use ${['itself', ...pure.slice(0, index)].join(', ')}`,
  severity: 'error',
  from: { path: below([layer]) },
  to: { path: `^src/`, pathNot: below(pure.slice(0, index + 1)) },
}))

const apart = edges.map((edge) => ({
  name: `apart-${edge}`,
  comment: 'edges meet in main and in the demo alone',
  severity: 'error',
  from: { path: below([edge]) },
  to: { path: '^src/', pathNot: below([...pure, edge]) },
}))

const io = pure.map((layer) => ({
  name: `pure-${layer}`,
  comment: 'everything before the edges is pure',
  severity: 'error',
  from: { path: below([layer]) },
  to: { dependencyTypes: ['core'], pathNot: `^(node:)?(${(builtIns[layer] ?? ['nothing']).join('|')})$` },
}))

const sole = Object.entries(packages).map(([name, users]) => ({
  name: `sole-user-${name}`,
  comment: `${name} is used in ${users.join(', ')} alone`,
  severity: 'error',
  from: { path: '^src/', pathNot: below(users) },
  to: { path: `node_modules/(@types/)?${name}/` },
}))

export default {
  forbidden: [
    ...order,
    ...apart,
    ...io,
    ...sole,
    {
      name: 'one-door',
      comment: 'exact totals are made in the vault and read in release, nowhere else',
      severity: 'error',
      from: { path: '^src/', pathNot: below(['vault', 'release']) },
      to: { path: '^src/release/exact\\.ts$' },
    },
    {
      name: 'bounded-door',
      comment: 'what the vault runs is made in bound, asked for in answer and run in vault, nowhere else',
      severity: 'error',
      from: { path: '^src/', pathNot: below(['bound', 'answer', 'vault']) },
      to: { path: '^src/bound/bounded-query\\.ts$' },
    },
    {
      name: 'vault-door',
      comment: 'the vault is asked through ask.ts, which takes no text',
      severity: 'error',
      from: { path: '^src/', pathNot: '^src/vault/ask\\.ts$' },
      to: { path: '^src/vault/run\\.ts$' },
    },
    {
      name: 'settings-at-the-top',
      comment: 'settings are read where the program is joined, and handed down as values',
      severity: 'error',
      from: { path: '^src/', pathNot: entries },
      to: { path: '^src/settings\\.ts$' },
    },
    {
      name: 'joints-are-ends',
      comment: 'what joins the edges is imported by nothing',
      severity: 'error',
      from: { path: '^src/', pathNot: `${entries}|${below(joints)}` },
      to: { path: `${entries}|${below(joints)}` },
    },
    {
      name: 'no-circle',
      comment: 'files that need each other are one idea; only the descents of a statement call each other',
      severity: 'error',
      from: { path: '^src/', pathNot: below(['sql', 'plan']) },
      to: { circular: true },
    },
    { name: 'no-tests', comment: 'the program does not use its tests', severity: 'error', from: { path: '^src/' }, to: { path: '^(test|\\.config|dist)/' } },
    {
      name: 'no-dev-packages',
      comment: 'what only tests need is not installed where the program runs',
      severity: 'error',
      from: { path: '^src/' },
      to: { dependencyTypes: ['npm-dev'], dependencyTypesNot: ['type-only'] },
    },
    { name: 'no-unknown', comment: 'every import exists and is in package.json', severity: 'error', from: {}, to: { couldNotResolve: true } },
  ],
  options: {
    tsPreCompilationDeps: true,
    tsConfig: { fileName: 'tsconfig.json' },
    doNotFollow: { path: 'node_modules' },
    exclude: { path: '^(dist|coverage)/' },
    enhancedResolveOptions: { exportsFields: ['exports'], conditionNames: ['import', 'node', 'default', 'types'] },
  },
}
