import { access, readdir, stat } from 'node:fs/promises'
import { join } from 'node:path'
import type { CatalogueDriver } from './catalogue/driver.ts'
import { moveDurably, removeDurably } from './durable-file.ts'
import { checkId, isId } from './ids.ts'
import type { Space } from './space.ts'

export interface FrameStore {
  /**
   * Takes over a staged Parquet file as the frame of a replay: it is moved, synced, and replaces an older one.
   * @throws InputError STORAGE_FULL
   */
  keep(replayId: string, stagedParquetPath: string): Promise<void>
  /** Where the frame lies; undefined when it was never kept, was removed or has been pruned. */
  path(replayId: string): Promise<string | undefined>
  /** True when there was one. */
  remove(replayId: string): Promise<boolean>
  /** Removes the frames of replays that ended more than this long ago; answers how many. */
  prune(olderThanMs: number): Promise<number>
}

export function frameStore(
  driver: CatalogueDriver,
  space: Space,
  options: { folder: string; clock: () => number },
): FrameStore {
  const place = (id: string) => join(options.folder, `${id}.parquet`)
  const remove = async (id: string) => {
    const bytes = await sizeOf(place(id))
    const removed = await removeDurably(place(id))
    if (removed) space.release(bytes)
    return removed
  }
  return {
    async keep(replayId, stagedParquetPath) {
      const to = place(checkId(replayId))
      const { size } = await stat(stagedParquetPath)
      const replaced = await sizeOf(to)
      await space.reserve(size)
      await space.guard(size, () => moveDurably(stagedParquetPath, to))
      space.release(replaced)
    },
    async path(replayId) {
      if (!isId(replayId)) return undefined
      return access(place(replayId)).then(
        () => place(replayId),
        () => undefined,
      )
    },
    remove: async (replayId) => isId(replayId) && remove(replayId),
    async prune(olderThanMs) {
      if (!(olderThanMs >= 0)) throw new Error(`olderThanMs: expected >= 0, got ${olderThanMs}`)
      const rows = await driver.query('SELECT id FROM replays WHERE finished_ms < $1', [
        Math.floor(options.clock() - olderThanMs),
      ])
      const old = new Set(rows.map((row) => row['id']))
      let removed = 0
      for (const id of await frameIds(options.folder)) if (old.has(id) && (await remove(id))) removed++
      return removed
    },
  }
}

/** Removes frames that no finished replay owns: a crash came between keeping the frame and keeping the sheet. */
export async function removeOrphanFrames(driver: CatalogueDriver, folder: string): Promise<void> {
  const rows = await driver.query(`SELECT id FROM replays WHERE state = 'done'`)
  const owned = new Set(rows.map((row) => `${row['id'] as string}.parquet`))
  for (const name of await readdir(folder)) if (!owned.has(name)) await removeDurably(join(folder, name))
}

async function frameIds(folder: string): Promise<string[]> {
  const names = await readdir(folder)
  return names.filter((name) => name.endsWith('.parquet')).map((name) => name.slice(0, -'.parquet'.length))
}

async function sizeOf(path: string): Promise<number> {
  return stat(path).then(
    ({ size }) => size,
    () => 0,
  )
}
