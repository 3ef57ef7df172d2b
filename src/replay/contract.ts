import type { Readable } from 'node:stream'
import type {
  CorrectionProof,
  ReadingOptions,
  ScoreSheet,
  ScoringSettings,
  SiteFile,
  Trend,
  WhatIsNew,
} from '../sheet/index.ts'

/** A log on this machine's disk, as it was sent. */
export interface LogFile {
  /** Name as the sender gave it, for receipts and messages. */
  readonly name: string
  readonly path: string
  /** SHA-256 of its bytes, hex, where somebody has made it already. */
  readonly sha256?: string
}

export interface OneShotRequest {
  readonly logs: readonly LogFile[]
  readonly site: SiteFile
  readonly reading: ReadingOptions
  readonly settings: ScoringSettings
  /** Rated power for turbines whose site file gives none, kW. */
  readonly ratedPowerKw?: number
}

/** A window of logs that the store holds. */
export interface StoredRequest {
  readonly site: string
  /** Epoch ms, first moment. */
  readonly fromMs: number
  /** Epoch ms, first moment after the window. */
  readonly toMs: number
  /** Default: all turbines that have rows in the window. */
  readonly turbines?: readonly string[]
  readonly settings: ScoringSettings
  /** Rated power for turbines whose site file gives none, kW. */
  readonly ratedPowerKw?: number
}

/** `arrow`: an Arrow IPC stream. */
export type RowsFormat = 'csv' | 'parquet' | 'arrow'

export interface RowsExport {
  /** Bytes of the file. Working files go away when it ends or is destroyed. */
  readonly stream: Readable
  readonly mediaType: string
}

export interface Progress {
  readonly stage: 'reading' | 'framing' | 'examining' | 'scoring' | 'writing'
  /** 0 to 1 within the stage. */
  readonly share: number
}

export type ReplayStateName = 'queued' | 'running' | 'done' | 'failed' | 'cancelled'

/** A replay as the catalogue knows it. */
export interface ReplayRecord {
  readonly id: string
  readonly state: ReplayStateName
  readonly site: string | null
  readonly createdMs: number
  readonly finishedMs: number | null
  /** The score sheet as JSON text, byte for byte as it was first answered; null until done. */
  readonly sheet: string | null
  readonly problem: { readonly code: string; readonly detail: string } | null
  /** How far it is; null unless it runs in this process. */
  readonly progress: Progress | null
}

/** Runs the questions over logs and keeps the answers. */
export interface Replays {
  /**
   * Reads, scores and, where there is a store, keeps a log. Resolves when the sheet is on disk.
   * @throws InputError LOG_*, BAD_SITE, BAD_OPTION
   */
  oneShot(request: OneShotRequest, onProgress?: (progress: Progress) => void): Promise<ScoreSheet>
  /**
   * Scores the rows that count in a window of a site, at once and beside whatever waits in the queue. Resolves when the
   * sheet is on disk. Its receipt: `accepted` are the rows of the window that count; `duplicate` those of the window that
   * a later log overruled and those overruled inside the logs it draws on; `rejected` those of these logs, in whole, since
   * a rejected row has no dependable time; `received` is their sum.
   * @throws InputError SITE_NOT_FOUND, TURBINE_NOT_FOUND, BAD_REQUEST for an empty window, LOG_NO_ROWS when it holds no
   *   rows, LOG_COLUMNS_MISSING, STORAGE_FULL
   */
  stored(request: StoredRequest, onProgress?: (progress: Progress) => void): Promise<ScoreSheet>
  /**
   * The same in the background, first come first served. Resolves when it is noted as `queued`; `get` then tells its
   * state and progress, and its sheet when it is done. What fails later fails the replay: state `failed`, `problem`.
   * @throws InputError SITE_NOT_FOUND, TURBINE_NOT_FOUND, BAD_REQUEST
   */
  start(request: StoredRequest): Promise<{ id: string }>
  /**
   * Every row of the frame with the reason it was set aside, or `used`: turbine by turbine (byte order), by time. Rows of
   * a high-rate log are the 10-minute ones that were scored; wind speeds are corrected as they were for the static offset.
   * @throws InputError REPLAY_NOT_FOUND (also when it has no sheet), FRAME_GONE when its rows have been removed by age
   */
  rows(id: string, format: RowsFormat): Promise<RowsExport>
  /** @throws InputError REPLAY_NOT_FOUND */
  get(id: string): Promise<ReplayRecord>
  /** Newest first, without sheets. `site`, `state`: only such replays. @throws InputError BAD_REQUEST */
  list(page: {
    after?: string
    limit: number
    site?: string
    state?: ReplayStateName
  }): Promise<{ replays: ReplayRecord[]; next: string | null }>
  /**
   * Months compared over the newest finished replays of a site.
   * @param page.replays  1 to 200: how many of them at most
   */
  trend(site: string, page: { replays: number }): Promise<Trend>
  /** What became of the corrections of a site, each by the newest sheet that could judge it, in the order of time. */
  proofs(site: string): Promise<CorrectionProof[]>
  /**
   * What the sheet of a finished replay says that the one made before it for the same site does not; null for a sheet
   * without a site.
   * @throws InputError REPLAY_NOT_FOUND
   */
  news(id: string): Promise<WhatIsNew | null>
  /**
   * Cancels a replay that waits or runs: its state becomes `cancelled` and stays to be read. Removes any other one with
   * its rows.
   * @throws InputError REPLAY_NOT_FOUND
   */
  remove(id: string): Promise<void>
  /** Starts nothing more, stops what runs and waits for it; the next start of the service names it interrupted. */
  close(): Promise<void>
}
