import { existsSync } from 'node:fs'
import { mkdtemp, rm } from 'node:fs/promises'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { createChecks } from './checks.ts'
import { kills } from './kills.ts'
import { posts } from './posts.ts'

/**
 * `npm run torture [-- kills COUNT [SEED]]` kills a service again and again; `npm run torture -- posts COUNT` posts small
 * logs without end. A summary line for each check; exit code 1 when one was violated. The service is what was built last,
 * or the main.js that TORTURE_MAIN names.
 */
const main = process.env['TORTURE_MAIN'] ?? join(import.meta.dirname, '../../dist/main.js')
const print = (line: string): void => {
  process.stdout.write(`${line}\n`)
}
const [name = 'kills', count, seed = '1'] = process.argv.slice(2)
const checks = createChecks(print)
if (!existsSync(main)) throw new Error(`${main} is not built: run npm run build`)
const folder = await mkdtemp(join(tmpdir(), 'yawledger-torture-'))
try {
  if (name === 'kills') await kills(checks, { main, folder, count: Number(count ?? 50), seed: Number(seed) })
  else if (name === 'posts') await posts(checks, { main, folder, count: Number(count ?? 10_000) })
  else throw new Error(`torture: expected kills or posts, got ${name}`)
} finally {
  await rm(folder, { recursive: true, force: true })
}
if (!checks.summary()) process.exitCode = 1
