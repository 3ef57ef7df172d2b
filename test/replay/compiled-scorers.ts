import { mkdirSync, readdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs'
import { dirname, join } from 'node:path'
import { fileURLToPath, pathToFileURL } from 'node:url'
import ts from 'typescript'
import type { Scorers } from '../../src/replay/index.ts'

const ROOT = fileURLToPath(new URL('../../', import.meta.url))
/** What scoring one turbine is made of. */
const PARTS = ['errors.ts', 'sheet', 'kernel', 'frame', 'analysis', 'replay']

/**
 * The scorers of the sources as they are now, compiled, because worker threads load compiled code and `dist` may be older.
 * They lie below node_modules, where packages are found and no other tool looks.
 */
export async function openCompiledScorers(threads: number): Promise<Scorers> {
  const folder = join(ROOT, `node_modules/.cache/yawledger-scorers-${process.pid}`)
  for (const part of PARTS) {
    const files = part.endsWith('.ts')
      ? [part]
      : readdirSync(join(ROOT, 'src', part), { recursive: true, encoding: 'utf8' }).map((name) =>
          join(part, name),
        )
    for (const file of files.filter((name) => name.endsWith('.ts') && !name.endsWith('.d.ts'))) {
      const target = join(folder, file.replace(/\.ts$/, '.js'))
      mkdirSync(dirname(target), { recursive: true })
      writeFileSync(target, compiled(join(ROOT, 'src', file)))
    }
  }
  writeFileSync(join(folder, 'package.json'), '{"type":"module"}')
  const scorers = (await import(pathToFileURL(join(folder, 'replay/scorers.js')).href)) as {
    openScorers: (count: number) => Scorers
  }
  const opened = scorers.openScorers(threads)
  return {
    score: (task) => opened.score(task),
    compare: (task) => opened.compare(task),
    examine: (rows) => opened.examine(rows),
    prove: (question) => opened.prove(question),
    async close() {
      await opened.close()
      rmSync(folder, { recursive: true, force: true })
    },
  }
}

function compiled(path: string): string {
  return ts.transpileModule(readFileSync(path, 'utf8'), {
    compilerOptions: {
      target: ts.ScriptTarget.ES2023,
      module: ts.ModuleKind.ESNext,
      rewriteRelativeImportExtensions: true,
      verbatimModuleSyntax: true,
    },
  }).outputText
}
