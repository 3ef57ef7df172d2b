import { spawn } from 'node:child_process'
import { readFile, readdir } from 'node:fs/promises'
import { join } from 'node:path'
import { createInterface } from 'node:readline'
import { expect, test } from 'vitest'
import { openStore } from '../../src/store/index.ts'
import { makeFolder } from './folder.ts'
import { readRows } from './logs.ts'

/** Moments after the first write at which the process is killed, ms; drawn once, spread over some dozen writes. */
const MOMENTS_MS = [17, 211, 463, 702, 1040]

test('a process killed at any moment leaves all of a log or none, and everything that was acknowledged', async () => {
  const folder = await makeFolder()
  const posted = new Set<number>()
  const unsure = new Set<number>()
  const scored = new Set<number>()
  let first = 0
  for (const momentMs of MOMENTS_MS) {
    const said = await writeUntilKilled(folder, first, momentMs)
    for (const [what, n] of said) {
      first = Math.max(first, n + 1)
      if (what === 'posting' || what === 'removing') unsure.add(n)
      if (what === 'posted') posted.add(n)
      if (what === 'removing' || what === 'removed') posted.delete(n)
      if (what === 'posted' || what === 'removed') unsure.delete(n)
      if (what === 'scored') scored.add(n)
    }
    const store = await openStore({ folder, clock: () => 1, newId: () => 'unused', keepFreeBytes: 0 })
    try {
      const found = await store.logs.list('quern-hill', { limit: 1000 })
      const numbers = new Set<number>()
      for (const { batch } of found.batches) {
        const rejected = await store.logs.rejectedPath('quern-hill', batch)
        numbers.add(Number(await readFile(rejected!, 'utf8')))
      }
      // What was cut off may be there or not; from here on it must stay as it was found.
      for (const n of unsure) if (numbers.has(n)) posted.add(n)
      unsure.clear()
      expect([...numbers].sort(), `killed after ${momentMs} ms`).toEqual([...posted].sort())

      const rows = new Map<number, number>()
      for (const [, , n] of await readRowsOf(folder, store)) rows.set(n!, (rows.get(n!) ?? 0) + 1)
      expect([...rows].sort()).toEqual([...posted].map((n) => [n, 4]).sort())
      expect(await store.logs.verify()).toEqual([])

      for (const n of scored) {
        expect((await store.replays.get(`r${n}`))?.sheet).toBe(`sheet ${n}`)
        expect(await readFile((await store.frames.path(`r${n}`))!, 'utf8')).toBe(`frame ${n}`)
      }
      for (const { id, state, sheet } of (await store.replays.list({ limit: 1000 })).replays) {
        expect([state, sheet === null], id).toEqual(state === 'done' ? ['done', false] : ['failed', true])
      }
      expect((await readdir(join(folder, 'rejected'))).length).toBe(posted.size)
    } finally {
      await store.close()
    }
  }
  expect(posted.size).toBeGreaterThan(5)
}, 180_000)

async function readRowsOf(folder: string, store: Awaited<ReturnType<typeof openStore>>) {
  const names = await readdir(join(folder, 'segments'))
  const rows = await readRows(store, 'quern-hill')
  expect(await readdir(join(folder, 'segments'))).toEqual(names)
  return rows
}

/** Starts the writer, kills it `momentMs` after it is ready, answers what it said until then. */
async function writeUntilKilled(
  folder: string,
  first: number,
  momentMs: number,
): Promise<[string, number][]> {
  const script = join(import.meta.dirname, 'endless-writer.ts')
  const child = spawn(process.execPath, ['--import', 'tsx', script, folder, String(first)], {
    stdio: ['ignore', 'pipe', 'pipe'],
  })
  let errors = ''
  child.stderr.on('data', (chunk: Buffer) => (errors += chunk.toString()))
  const ended = new Promise<NodeJS.Signals | null>((done) => {
    child.on('close', (_, signal) => {
      done(signal)
    })
  })
  const said: [string, number][] = []
  for await (const line of createInterface({ input: child.stdout })) {
    const [what, n] = line.split(' ') as [string, string]
    if (what === 'ready') setTimeout(() => child.kill('SIGKILL'), momentMs)
    said.push([what, Number(n)])
  }
  expect(await ended, errors).toBe('SIGKILL')
  return said
}
