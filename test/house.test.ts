import { readdirSync, readFileSync, statSync } from 'node:fs'
import { dirname, join, relative, resolve } from 'node:path'
import { fileURLToPath } from 'node:url'
import ts from 'typescript'
import { expect, test } from 'vitest'

const ROOT = fileURLToPath(new URL('..', import.meta.url))
const SRC = join(ROOT, 'src')

/** Who may import whom, besides errors.ts and sheet/, which anyone may. main.ts may import everything. */
const ARROWS: Readonly<Record<string, readonly string[]>> = {
  sheet: [],
  kernel: [],
  frame: ['kernel'],
  analysis: ['kernel', 'frame'],
  duck: [],
  log: ['duck', 'kernel'],
  store: ['duck', 'kernel'],
  intake: ['log', 'store'],
  setup: ['store'],
  replay: ['analysis', 'frame', 'store', 'log'],
  chart: [],
  page: ['chart'],
  simulate: ['kernel'],
  http: ['intake', 'setup', 'replay', 'chart', 'page', 'simulate'],
  cli: ['intake', 'setup', 'replay', 'chart', 'page', 'simulate'],
  'config.ts': [],
  'errors.ts': [],
}
const OPEN_TO_ALL = ['errors.ts', 'sheet']

interface Import {
  readonly from: string
  readonly to: string
}

function filesBelow(folder: string): string[] {
  return readdirSync(folder).flatMap((name) => {
    const path = join(folder, name)
    return statSync(path).isDirectory() ? filesBelow(path) : [path]
  })
}

/** Specifiers of every import of a source text: static, re-exported, type-only, dynamic, and `import('...')` types. */
function specifiersOf(name: string, text: string): string[] {
  const found: string[] = []
  const visit = (node: ts.Node): void => {
    if (ts.isImportDeclaration(node) || ts.isExportDeclaration(node)) {
      if (node.moduleSpecifier && ts.isStringLiteral(node.moduleSpecifier))
        found.push(node.moduleSpecifier.text)
    } else if (ts.isCallExpression(node) && node.expression.kind === ts.SyntaxKind.ImportKeyword) {
      const [argument] = node.arguments
      found.push(argument && ts.isStringLiteralLike(argument) ? argument.text : '(computed)')
    } else if (ts.isImportTypeNode(node) && ts.isLiteralTypeNode(node.argument)) {
      if (ts.isStringLiteral(node.argument.literal)) found.push(node.argument.literal.text)
    }
    ts.forEachChild(node, visit)
  }
  visit(ts.createSourceFile(name, text, ts.ScriptTarget.Latest, true))
  return found
}

/** The room of a file: its first folder below src, or its own name when it stands in src itself. */
function roomOf(path: string): string {
  return path.split('/', 1)[0] ?? path
}

const files = filesBelow(SRC).filter((path) => path.endsWith('.ts'))
const imports: Import[] = files.flatMap((path) =>
  specifiersOf(path, readFileSync(path, 'utf8'))
    .filter((specifier) => specifier.startsWith('.') || specifier === '(computed)')
    .map((specifier) => ({
      from: relative(SRC, path),
      to: specifier === '(computed)' ? specifier : relative(SRC, resolve(dirname(path), specifier)),
    })),
)

function forbidden({ from, to }: Import): boolean {
  const [room, target] = [roomOf(from), roomOf(to)]
  if (target === '..' || to === '(computed)') return true
  if (room === target || (OPEN_TO_ALL.includes(target) && room !== 'errors.ts')) return false
  if (room === 'main.ts') return false
  return !(ARROWS[room] ?? []).includes(target)
}

/** One cycle of files, first file again at the end; undefined when there is none. */
function findCycle(arrows: readonly Import[]): string[] | undefined {
  const next = new Map<string, string[]>()
  for (const { from, to } of arrows) next.set(from, [...(next.get(from) ?? []), to])
  const finished = new Set<string>()
  const walk = (file: string, path: readonly string[]): string[] | undefined => {
    if (path.includes(file)) return [...path.slice(path.indexOf(file)), file]
    if (finished.has(file)) return undefined
    for (const one of next.get(file) ?? []) {
      const cycle = walk(one, [...path, file])
      if (cycle) return cycle
    }
    finished.add(file)
    return undefined
  }
  for (const file of next.keys()) {
    const cycle = walk(file, [])
    if (cycle) return cycle
  }
  return undefined
}

test('the reader of imports sees every kind of import', () => {
  const text = `import a from './a.ts'; import type { B } from './b.ts'; export * from './c.ts'
    export { d } from './d.ts'; const e = await import('./e.ts'); type F = import('./f.ts').F; import './g.ts'
    const h = await import(name)`
  const expected = ['./a.ts', './b.ts', './c.ts', './d.ts', './e.ts', './f.ts', './g.ts', '(computed)']
  expect(specifiersOf('x.ts', text)).toEqual(expected)
})

test('the check tells a wrong arrow and a cycle from right ones', () => {
  const cases: [string, string, boolean][] = [
    ['kernel/angle/wrap.ts', 'frame/frame.ts', true],
    ['kernel/angle/wrap.ts', 'kernel/stats/mean.ts', false],
    ['log/stage.ts', 'store/index.ts', true],
    ['http/server.ts', 'cli/index.ts', true],
    ['http/server.ts', 'config.ts', true],
    ['http/server.ts', '../test/x.ts', true],
    ['http/server.ts', '(computed)', true],
    ['main.ts', 'config.ts', false],
    ['analysis/energy.ts', 'sheet/index.ts', false],
    ['attic/x.ts', 'kernel/angle/wrap.ts', true],
  ]
  for (const [from, to, bad] of cases) expect(forbidden({ from, to }), `${from} -> ${to}`).toBe(bad)
  const cycle = [
    { from: 'a', to: 'b' },
    { from: 'b', to: 'c' },
    { from: 'c', to: 'b' },
  ]
  expect(findCycle(cycle)).toEqual(['b', 'c', 'b'])
  expect(findCycle(cycle.slice(0, 2))).toBeUndefined()
})

test('imports follow the arrows of the house', () => {
  expect(imports.length).toBeGreaterThan(files.length)
  expect(imports.filter(forbidden).map(({ from, to }) => `${from} -> ${to}`)).toEqual([])
})

test('no file imports itself by way of others', () => {
  expect(findCycle(imports)).toBeUndefined()
})

test('every import of a file names one that is there', () => {
  const there = new Set(files.map((path) => relative(SRC, path)))
  expect(imports.filter(({ to }) => !there.has(to)).map(({ from, to }) => `${from} -> ${to}`)).toEqual([])
})

test('every room is one that the table knows, and none is called utils', () => {
  const rooms = new Set(files.map((path) => roomOf(relative(SRC, path))))
  expect([...rooms].filter((room) => room !== 'main.ts' && !(room in ARROWS))).toEqual([])
  const names = files.flatMap((path) => relative(SRC, path).split('/'))
  expect(names.filter((name) => /^(utils?|helpers?|misc|common-utils)(\.ts)?$/.test(name))).toEqual([])
})

test('only main.ts reads the settings', () => {
  const readers = imports.filter(({ to }) => to === 'config.ts').map(({ from }) => from)
  expect([...new Set(readers)]).toEqual(['main.ts'])
})

test('SQL stands in duck, log and store alone', () => {
  const sql =
    /\b(SELECT\s[^]*?\sFROM|INSERT\s+INTO|DELETE\s+FROM|UPDATE\s+\w+\s+SET|CREATE\s+(TEMP\s+)?(TABLE|VIEW)|COPY\s*\()/
  const withSql: string[] = []
  for (const path of files) {
    const room = roomOf(relative(SRC, path))
    if (['duck', 'log', 'store'].includes(room)) continue
    const visit = (node: ts.Node): void => {
      const literal = ts.isStringLiteralLike(node) || ts.isTemplateExpression(node)
      if (literal && sql.test(node.getText())) withSql.push(relative(SRC, path))
      ts.forEachChild(node, visit)
    }
    visit(ts.createSourceFile(path, readFileSync(path, 'utf8'), ts.ScriptTarget.Latest, true))
  }
  expect(withSql).toEqual([])
  expect(
    sql.test('SELECT a FROM b') && sql.test('INSERT INTO t') && !sql.test('please select one from here'),
  ).toBe(true)
})
