import type { TurbineColumns } from '../frame/index.ts'
import type { ScoringSettings, SiteFile } from '../sheet/index.ts'
import { readRows, reduceRows, REDUCED_INTERVAL_S, type Store } from '../store/index.ts'

/** What a sheet was made with beside its rows: the frame is made again from both. */
export interface KeptRequest {
  readonly site: SiteFile
  readonly settings: ScoringSettings
  readonly ratedPowerKw: number | null
  /** Interval of the kept rows where they are reduced before they are scored, s; null: scored as they are. */
  readonly reducedFromS: number | null
  /** Response of each anemometer that its wind speeds were corrected for, relative change per degree of vane. */
  readonly responsesPerDeg: Readonly<Record<string, number>>
}

/**
 * The rows that are scored: those of a Parquet file of clean rows, or their 10-minute statistics. One entry per turbine in
 * byte order of the names.
 */
export async function frameRows(
  scans: Store['scans'],
  path: string,
  reducedFromS: number | null,
): Promise<TurbineColumns[]> {
  return reducedFromS === null ? readRows(scans, path) : reduceRows(scans, path, reducedFromS)
}

/** Length of the interval that is scored, s; null where the log does not show it. */
export function scoredIntervalS(reducedFromS: number | null, loggedS: number | null): number | null {
  return reducedFromS === null ? loggedS : REDUCED_INTERVAL_S
}
