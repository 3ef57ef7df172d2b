import { existsSync } from 'node:fs'
import { mkdir, readFile, readdir, writeFile } from 'node:fs/promises'
import { join } from 'node:path'
import { expect, test } from 'vitest'
import type { Store } from '../../src/store/index.ts'
import { makeFolder, openTestStore } from './folder.ts'

test('a frame is moved into its place and found there after a restart', async () => {
  const folder = await makeFolder()
  const store = await openTestStore(folder)
  const staged = await stage(store, 'rows')
  await store.replays.begin({ id: 'r1', site: null, createdMs: 1 })
  await store.frames.keep('r1', staged)
  await store.replays.finish('r1', '{}', 2)
  expect(existsSync(staged)).toBe(false)
  await store.close()
  const again = await openTestStore(folder)
  expect(await readFile((await again.frames.path('r1'))!, 'utf8')).toBe('rows')
})

test('a frame whose sheet was never kept is removed at start, and so is what lay in the temporary folder', async () => {
  const folder = await makeFolder()
  const store = await openTestStore(folder)
  await store.replays.begin({ id: 'r1', site: null, createdMs: 1 })
  await store.frames.keep('r1', await stage(store, 'rows'))
  await stage(store, 'left behind')
  await mkdir(join(store.tempFolder, 'sub'))
  await writeFile(join(folder, 'frames', 'r2.parquet.partial'), 'half')
  await store.close()
  const again = await openTestStore(folder)
  expect(await again.frames.path('r1')).toBeUndefined()
  expect(await readdir(join(folder, 'frames'))).toEqual([])
  expect(await readdir(again.tempFolder)).toEqual([])
})

test('pruning removes the frames of replays that ended too long ago and keeps their sheets', async () => {
  const store = await openTestStore(await makeFolder(), { clock: () => 100_000 })
  for (const [id, finishedMs] of [
    ['old', 39_999],
    ['new', 40_000],
  ] as const) {
    await store.replays.begin({ id, site: null, createdMs: 1 })
    await store.frames.keep(id, await stage(store, id))
    await store.replays.finish(id, '{}', finishedMs)
  }
  expect(await store.frames.prune(60_000)).toBe(1)
  expect(await store.frames.path('old')).toBeUndefined()
  expect(await store.frames.path('new')).toBeDefined()
  expect((await store.replays.get('old'))?.sheet).toBe('{}')
})

test('an id never leads out of the folder', async () => {
  const store = await openTestStore(await makeFolder())
  const staged = await stage(store, 'rows')
  await expect(store.frames.keep('../r1', staged)).rejects.toThrow(/id: expected/)
  expect(await store.frames.path('../catalogue')).toBeUndefined()
  expect(await store.frames.remove('../catalogue')).toBe(false)
})

test('a frame beyond the limit of the folder is refused, and room that was freed counts again', async () => {
  const store = await openTestStore(await makeFolder(), { limitBytes: 10 })
  await store.frames.keep('r1', await stage(store, '123456'))
  const second = await stage(store, '12345')
  await expect(store.frames.keep('r2', second)).rejects.toThrow(
    expect.objectContaining({ code: 'STORAGE_FULL' }) as Error,
  )
  expect(await readFile((await store.frames.path('r1'))!, 'utf8')).toBe('123456')
  expect(await store.frames.remove('r1')).toBe(true)
  await store.frames.keep('r2', second)
  expect(await readFile((await store.frames.path('r2'))!, 'utf8')).toBe('12345')
})

let staged = 0
async function stage(store: Store, content: string): Promise<string> {
  const path = join(store.tempFolder, `staged-${++staged}`)
  await writeFile(path, content)
  return path
}
