import type { ReadingOptions, ScoreSheet, ScoringSettings, SiteFile } from '../sheet/index.ts'

/** A log on this machine's disk, as it was sent. */
export interface LogFile {
  /** Name as the sender gave it, for receipts and messages. */
  readonly name: string
  readonly path: string
}

export interface OneShotRequest {
  readonly logs: readonly LogFile[]
  readonly site: SiteFile
  readonly reading: ReadingOptions
  readonly settings: ScoringSettings
  /** Rated power for turbines whose site file gives none, kW. */
  readonly ratedPowerKw?: number
}

export interface Progress {
  readonly stage: 'reading' | 'framing' | 'scoring' | 'writing'
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
}

/** Runs the questions over logs and keeps the answers. */
export interface Replays {
  /**
   * Reads, scores and, where there is a store, keeps a log. Resolves when the sheet is on disk.
   * @throws InputError LOG_*, BAD_SITE, BAD_OPTION
   */
  oneShot(request: OneShotRequest, onProgress?: (progress: Progress) => void): Promise<ScoreSheet>
  /** @throws InputError REPLAY_NOT_FOUND */
  get(id: string): Promise<ReplayRecord>
  list(page: { after?: string; limit: number }): Promise<{ replays: ReplayRecord[]; next: string | null }>
  /** @throws InputError REPLAY_NOT_FOUND */
  remove(id: string): Promise<void>
}
