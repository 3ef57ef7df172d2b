import { execFile } from 'node:child_process'
import { writeFile } from 'node:fs/promises'
import { join } from 'node:path'
import { promisify } from 'node:util'
import { DuckDBInstance } from '@duckdb/node-api'
import { expect, test } from 'vitest'
import { openStore } from '../../src/store/index.ts'
import { counter, makeFolder, makeSmallDisk, openTestStore } from './folder.ts'

const inUse = expect.objectContaining({
  code: 'NOT_READY',
  message: expect.stringContaining('data folder is in use by another process') as string,
}) as Error

test('a second process on the same folder is refused and leaves its temporary files alone', async () => {
  const folder = await makeFolder()
  const store = await openTestStore(folder)
  await writeFile(join(store.tempFolder, 'mine'), 'x')
  const script = `
    import { openStore } from ${JSON.stringify(join(import.meta.dirname, '../../src/store/index.ts'))}
    try {
      const store = await openStore({ folder: process.argv[1], clock: Date.now, newId: () => 'x' })
      await store.close()
      console.log('opened')
    } catch (error) { console.log(error.code + ' ' + error.message) }`
  const second = async () =>
    (
      await promisify(execFile)(process.execPath, [
        '--import',
        'tsx',
        '--input-type=module',
        '-e',
        script,
        folder,
      ])
    ).stdout
  expect(await second()).toMatch(/^NOT_READY data folder is in use by another process/)
  await writeFile(join(store.tempFolder, 'mine'), 'y', { flag: 'r+' })
  await store.ready()
  await store.close()
  expect(await second()).toBe('opened\n')
})

test('a second store in the same process is refused until the first is closed', async () => {
  const folder = await makeFolder()
  const store = await openTestStore(folder)
  await expect(openTestStore(folder)).rejects.toThrow(inUse)
  await store.close()
  await store.close()
  await (await openTestStore(folder)).ready()
})

test('a closed store is not ready', async () => {
  const store = await openTestStore(await makeFolder())
  await store.ready()
  await store.close()
  await expect(store.ready()).rejects.toThrow(expect.objectContaining({ code: 'NOT_READY' }) as Error)
})

test('a folder that a newer version wrote is refused and can be opened by that version still', async () => {
  const folder = await makeFolder()
  await (await openTestStore(folder)).close()
  const instance = await DuckDBInstance.create(join(folder, 'catalogue.duckdb'))
  const connection = await instance.connect()
  await connection.run('INSERT INTO schema_versions VALUES (9999, 1)')
  connection.closeSync()
  instance.closeSync()
  const bad = expect.objectContaining({ code: 'BAD_CONFIG' }) as Error
  await expect(openTestStore(folder)).rejects.toThrow(bad)
  // Refused again for the same reason, not because the first attempt still holds the folder.
  await expect(openTestStore(folder)).rejects.toThrow(bad)
})

test('a folder that is a file, and a damaged catalogue, are wrong settings', async () => {
  const folder = await makeFolder()
  await writeFile(join(folder, 'file'), 'x')
  const bad = expect.objectContaining({ code: 'BAD_CONFIG' }) as Error
  await expect(openTestStore(join(folder, 'file'))).rejects.toThrow(bad)
  await writeFile(join(folder, 'catalogue.duckdb'), 'this is no database '.repeat(1000))
  await expect(openTestStore(folder)).rejects.toThrow(bad)
})

test('on a full disk a write is STORAGE_FULL, what was stored is read, and writes go on when there is room again', async (context) => {
  const folder = await makeSmallDisk(12)
  if (!folder) {
    context.skip('this user may not mount a small disk')
    return
  }
  const store = await openStore({ folder, clock: () => 1, newId: counter(), keepFreeBytes: 0 })
  try {
    const kept: string[] = []
    const sheet = (i: number) =>
      Array.from({ length: 20_000 }, (_, k) => (k * 7919 + i * 104729) % 9973).join()
    let failure: unknown
    for (let i = 0; i < 400 && failure === undefined; i++) {
      try {
        await store.replays.begin({ id: `r${i}`, site: null, createdMs: i })
        await store.replays.finish(`r${i}`, sheet(i), i)
        kept.push(`r${i}`)
      } catch (error) {
        failure = error
      }
    }
    expect(failure).toMatchObject({ code: 'STORAGE_FULL' })
    expect(kept.length).toBeGreaterThan(10)
    for (const [i, id] of kept.entries()) expect((await store.replays.get(id))?.sheet, id).toBe(sheet(i))
    await import('node:child_process').then(({ execFileSync }) =>
      execFileSync('mount', ['-o', 'remount,size=64m', folder]),
    )
    await store.replays.begin({ id: 'later', site: null, createdMs: 1_000 })
    await store.replays.finish('later', '{}', 1_001)
    await store.close()
    const again = await openStore({ folder, clock: () => 1, newId: counter(), keepFreeBytes: 0 })
    for (const [i, id] of kept.entries()) expect((await again.replays.get(id))?.sheet, id).toBe(sheet(i))
    expect((await again.replays.get('later'))?.sheet).toBe('{}')
    await again.close()
  } finally {
    await store.close()
  }
})
