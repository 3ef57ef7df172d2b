import type { Scans } from '../duck/index.ts'
import type { ReadingOptions, Receipt } from '../sheet/index.ts'

/** A log on disk as it was sent. Gzip is recognised by its first bytes, whatever the name says. */
export interface LogSource {
  /** Name as the sender gave it: for receipts, messages, and the turbine's name where nothing else gives it. */
  readonly name: string
  readonly path: string
  /** SHA-256 (hex) of the bytes as sent, where the caller has it already; else it is made while reading. */
  readonly sha256?: string
}

/** Bounds that keep a hostile or broken file from filling memory and disk. */
export interface LogLimits {
  readonly maxDecompressedBytes: number
  /** Longest line, bytes after decompression. */
  readonly maxLineBytes: number
  readonly maxColumns: number
  readonly maxRows: number
}

export const DEFAULT_LIMITS: LogLimits = {
  maxDecompressedBytes: 8 * 1024 ** 3,
  maxLineBytes: 1024 ** 2,
  maxColumns: 2000,
  maxRows: 400_000_000,
}

/** Reading options of the request, with the site's defaults behind them. */
export type LogReading = ReadingOptions & {
  readonly defaultTimezone?: string
  readonly defaultStamp?: 'begin' | 'end'
}

export interface LogParts {
  readonly scans: Scans
  /** Existing folder that `scans` may read and write; the staged files are left in it, working files are removed. */
  readonly folder: string
  readonly limits: LogLimits
}

export interface StagedLog {
  /**
   * Parquet: turbine VARCHAR, time BIGINT (epoch ms, start of interval), one DOUBLE per number channel found, VARCHAR
   * status and availability_category. NULL = missing. Sorted by turbine (byte order of UTF-8) and time; a pair occurs once.
   */
  readonly path: string
  /** CSV with file, line, reason, text of every rejected row; null when there is none. */
  readonly rejectedPath: string | null
  readonly receipt: Receipt
  /** Columns of the Parquet file after turbine and time. */
  readonly channels: readonly string[]
}
