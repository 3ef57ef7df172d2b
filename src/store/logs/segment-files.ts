import { createHash } from 'node:crypto'
import { createReadStream } from 'node:fs'
import { readdir } from 'node:fs/promises'
import { join } from 'node:path'
import { pipeline } from 'node:stream/promises'
import type { CatalogueDriver } from '../catalogue/driver.ts'
import { removeDurably } from '../durable-file.ts'
import type { Space } from '../space.ts'

/** The files of segments: immutable, and removed only when nobody can be reading them. */
export interface SegmentFiles {
  readonly folder: string
  path(segment: string): string
  /** Runs `work`; files that are given up meanwhile stay until it ends. It must ask the catalogue inside. */
  reading<T>(work: () => Promise<T>): Promise<T>
  /** Gives up files that the catalogue no longer names: removed once those who may read them have ended. */
  giveUp(segments: readonly { segment: string; bytes: number }[]): void
  /** Resolves when all files given up so far are removed. */
  settled(): Promise<void>
}

/** @param report  told when a file cannot be removed; it is tried again at the next start */
export function segmentFiles(folder: string, space: Space, report: (error: unknown) => void): SegmentFiles {
  const readers = new Set<Promise<unknown>>()
  const removals = new Set<Promise<unknown>>()
  const path = (segment: string) => join(folder, `${segment}.parquet`)
  return {
    folder,
    path,
    reading(work) {
      const running = work()
      const ended = running.then(
        () => undefined,
        () => undefined,
      )
      readers.add(ended)
      void ended.then(() => readers.delete(ended))
      return running
    },
    giveUp(segments) {
      const removal = Promise.all(readers)
        .then(async () => {
          for (const { segment, bytes } of segments) {
            await removeDurably(path(segment))
            space.release(bytes)
          }
        })
        .catch(report)
      removals.add(removal)
      void removal.then(() => removals.delete(removal))
    },
    async settled() {
      while (removals.size > 0) await Promise.all(removals)
    },
  }
}

/** Removes what a crash left: files that no row of the catalogue names. */
export async function removeOrphans(
  driver: CatalogueDriver,
  folders: { segments: string; rejected: string },
): Promise<void> {
  const segments = await driver.query('SELECT segment FROM segments')
  const batches = await driver.query('SELECT batch FROM batches WHERE has_rejected')
  const known = new Set([
    ...segments.map((row) => join(folders.segments, `${row['segment'] as string}.parquet`)),
    ...batches.map((row) => join(folders.rejected, `${row['batch'] as string}.csv`)),
  ])
  for (const folder of [folders.segments, folders.rejected]) {
    for (const name of await readdir(folder)) {
      if (!known.has(join(folder, name))) await removeDurably(join(folder, name))
    }
  }
}

/** SHA-256 of a file, hexadecimal. */
export async function fileChecksum(path: string): Promise<string> {
  const hash = createHash('sha256')
  await pipeline(createReadStream(path), hash)
  return hash.digest('hex')
}
