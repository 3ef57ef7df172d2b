import { mkdtemp, mkdir, rm, writeFile } from 'node:fs/promises'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { openScans, quoteText } from '../../src/duck/index.ts'
import { DEFAULT_LIMITS, stageLog, type LogLimits, type LogReading } from '../../src/log/index.ts'
import type { Receipt } from '../../src/sheet/index.ts'

export type Cell = number | string | null

export interface Staged {
  receipt: Receipt
  channels: readonly string[]
  /** Rows of the Parquet file in its own order. */
  rows: Record<string, Cell>[]
  /** Rejected rows as CSV text; null when there are none. */
  rejected: string | null
}

/** Stages logs given as bytes in a folder of their own, reads everything back and removes the folder. */
export async function staged(
  files: Record<string, string | Uint8Array>,
  reading: LogReading = {},
  limits: Partial<LogLimits> = {},
  checksums: Readonly<Record<string, string>> = {},
): Promise<Staged> {
  const home = await mkdtemp(join(tmpdir(), 'log-'))
  const folder = join(home, 'staged')
  await mkdir(folder)
  const scans = await openScans({ folder, memoryMb: 200, threads: 2 })
  try {
    const sources = []
    for (const [name, bytes] of Object.entries(files)) {
      const path = join(home, `sent-${sources.length}`)
      await writeFile(path, bytes)
      const sha256 = checksums[name]
      sources.push(sha256 === undefined ? { name, path } : { name, path, sha256 })
    }
    const log = await stageLog(sources, reading, { scans, folder, limits: { ...DEFAULT_LIMITS, ...limits } })
    const quoted = quoteText(log.path)
    const rows = await scans.withConnection((c) => c.records(`SELECT * FROM read_parquet(${quoted})`))
    const { readFile } = await import('node:fs/promises')
    return {
      receipt: log.receipt,
      channels: log.channels,
      rows: rows as Record<string, Cell>[],
      rejected: log.rejectedPath === null ? null : await readFile(log.rejectedPath, 'utf8'),
    }
  } finally {
    await scans.close()
    await rm(home, { recursive: true, force: true })
  }
}

/** The code an attempt fails with, and its message. */
export async function failure(attempt: Promise<unknown>): Promise<{ code: string; message: string }> {
  try {
    await attempt
  } catch (error) {
    return { code: (error as { code?: string }).code ?? `no code: ${String(error)}`, message: String(error) }
  }
  return { code: 'none', message: 'it went through' }
}

/** received = accepted + duplicate + rejected, and the parts of rejected add up. */
export function accountAddsUp({ receipt, rows, rejected }: Staged): boolean {
  const byReason = receipt.rejectedByReason.reduce((sum, { rows: n }) => sum + n, 0)
  const byTurbine = receipt.turbines.reduce((sum, { rows: n }) => sum + n, 0)
  const byInput = receipt.inputs.reduce((sum, { rows: n }) => sum + n, 0)
  return (
    receipt.received === receipt.accepted + receipt.duplicate + receipt.rejected &&
    receipt.rejected === byReason &&
    receipt.accepted === byTurbine &&
    receipt.received === byInput &&
    receipt.accepted === rows.length &&
    (rejected === null) === (receipt.rejected === 0)
  )
}
