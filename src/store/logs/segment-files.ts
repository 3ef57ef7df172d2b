import { createHash } from 'node:crypto'
import { createReadStream } from 'node:fs'
import { readdir } from 'node:fs/promises'
import { join } from 'node:path'
import { pipeline } from 'node:stream/promises'
import { quoteText, quoteTexts } from '../../duck/index.ts'
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

/**
 * SQL of all rows of segments, each with `batch_seq`; columns that a file lacks are NULL.
 * @param segments  at least one; `onlySeq` as in the catalogue
 */
export function segmentRows(
  files: SegmentFiles,
  segments: readonly { segment: string; onlySeq: number | null }[],
): string {
  const mixed = segments.filter(({ onlySeq }) => onlySeq === null)
  const sources = segments
    .filter(({ onlySeq }) => onlySeq !== null)
    .map(({ segment, onlySeq }) => {
      const path = quoteText(files.path(segment))
      return `SELECT *, ${onlySeq!}::BIGINT AS batch_seq FROM read_parquet(${path})`
    })
  if (mixed.length > 0) {
    const paths = quoteTexts(mixed.map(({ segment }) => files.path(segment)))
    sources.push(`SELECT * FROM read_parquet(${paths}, union_by_name = true)`)
  }
  return `(${sources.join(' UNION ALL BY NAME ')})`
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
