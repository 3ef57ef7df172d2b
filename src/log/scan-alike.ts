import { link, rm } from 'node:fs/promises'
import { join } from 'node:path'
import { InputError } from '../errors.ts'
import { NotAlike, type AlikeScanner } from './alike-lines.ts'
import type { CleanFile } from './clean-file.ts'
import type { LogParts } from './contract.ts'
import type { ReadableSource } from './parquet-source.ts'
import type { SourcePlan } from './plan-source.ts'
import type { ScanCounts } from './post-state.ts'
import { sourceBytes } from './source-bytes.ts'
import { copyRows } from './stage-rows.ts'

/**
 * Names a log within the folder that the scans may read, without copying it. Its own name could be a pattern to SQL.
 * @returns null where the file system cannot.
 */
export async function linkedSource(
  source: ReadableSource,
  index: number,
  folder: string,
  working: string[],
): Promise<string | null> {
  const path = join(folder, `log-${index}.csv`)
  if (working.includes(path)) return path
  try {
    await link(source.path, path)
  } catch {
    return null
  }
  return path
}

/**
 * Looks at a log whose lines are taken to be alike; when `isCopied`, DuckDB writes its rows at the same time.
 * @throws NotAlike as soon as it shows to be otherwise; what was written is removed then
 */
export async function scanAlike(
  scanner: AlikeScanner,
  file: CleanFile,
  isCopied: boolean,
  { source }: SourcePlan,
  { scans, folder, limits }: LogParts,
): Promise<{ counts: ScanCounts; sha256: string; copied: number | null }> {
  const connection = await scans.connect()
  const channels = file.channels.map((column) => column.takenFor!)
  // A failure waits until the scan has come to its end: it must not be unhandled meanwhile.
  const copying = isCopied
    ? copyRows(connection, file, channels, folder).catch((error: unknown) => ({ error }))
    : null
  try {
    const bytes = await sourceBytes(source, limits)
    await scanner.read(bytes.chunks)
    const copied = copying && (await copying)
    if (copied !== null && typeof copied !== 'number') throw new NotAlike('', { cause: copied.error })
    return { counts: scanner, sha256: bytes.sha256(), copied }
  } catch (error) {
    connection.interrupt()
    await copying
    await rm(join(folder, 'staged.parquet'), { force: true })
    // Limits are left to the scan line by line too, which names line and text.
    throw error instanceof InputError ? new NotAlike('', { cause: error }) : error
  } finally {
    connection.close()
  }
}
