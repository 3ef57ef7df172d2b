import { newTrack, track, type TurbineTrack } from './row-clock.ts'
import type { Rejects } from './rejects.ts'

export const MOST_TURBINES = 20_000

/** What all sources of one post share. */
export interface PostState {
  readonly tracks: Map<string, TurbineTrack>
  readonly rejects: Rejects
  /** Rows passed on so far come sorted by turbine and time. */
  sorted: boolean
  /** Turbine of the last row. */
  last: TurbineTrack | null
  /** A pair of turbine and time may have occurred twice. */
  mayRepeat: boolean
  rows: number
}

/** What the pass over the lines of one source counted. */
export interface ScanCounts {
  readonly blankLines: number
  /** Rows passed on. */
  readonly rows: number
  readonly repairedLines: number
  readonly unzonedRows: number
  readonly repeatedHourRows: number
  /** Keys of JSON objects that the beginning of the log did not show. */
  readonly unknownKeys: number
  /** Empty cells per field among rows passed on. */
  readonly emptyCells: Float64Array
}

/** The track of a turbine, made at its first row; undefined beyond 20,000: then the column holds no turbines. */
export function trackOf(post: PostState, name: string): TurbineTrack | undefined {
  let found = post.tracks.get(name)
  if (!found && post.tracks.size < MOST_TURBINES) post.tracks.set(name, (found = newTrack(name)))
  return found
}

/** Notes a row that is passed on: its order, and whether its time may have been there before. */
export function noteRow(post: PostState, turbine: TurbineTrack, timeMs: number): void {
  if (turbine !== post.last) {
    const isLower =
      post.last !== null && Buffer.compare(Buffer.from(post.last.name), Buffer.from(turbine.name)) > 0
    if (turbine.rows > 0 || isLower) post.sorted = false
    post.last = turbine
  }
  if (!track(turbine, timeMs)) {
    post.sorted = false
    post.mayRepeat = true
  }
  post.rows++
}
