import { availableParallelism } from 'node:os'
import PQueue from 'p-queue'
import {
  DAY_MARGIN_MS,
  DAY_MS,
  HIGH_RATE_CHANNELS,
  highRateRows,
  type HighRateDay,
  type HighRateRecord,
} from '../analysis/index.ts'
import type { TurbineFrame } from '../frame/index.ts'
import { openHighRate, type Store } from '../store/index.ts'
import type { Progress } from './contract.ts'
import type { Scorers } from './scorers.ts'

/** Rows further apart than this tell nothing that their 10-minute statistics do not, s. */
const SLOWEST_S = 60

/** @param intervalS  of the finest rows of a log that is reduced before it is scored, s. */
export function isExamined(intervalS: number): boolean {
  return intervalS <= SLOWEST_S
}

/**
 * Looks at the high-rate rows themselves, a turbine's day (UTC) at a time: each is read, handed to a worker thread and
 * forgotten, so that memory does not grow with the length of the log. The result does not depend on threads.
 *
 * @param path  Parquet of clean rows, of which the frames' intervals were made; in the data folder.
 * @returns one record per turbine, in order; days without rows are not in it.
 */
export async function examineHighRate(
  parts: { store: Store; scorers: Pick<Scorers, 'examine'> },
  path: string,
  turbines: readonly TurbineFrame[],
  signal: AbortSignal,
  onProgress: (progress: Progress) => void,
): Promise<HighRateRecord[]> {
  const source = await openHighRate(parts.store.scans, path)
  const channels = HIGH_RATE_CHANNELS.filter((name) => source.numbers.includes(name))
  // One is read while others are worked on; more would only hold memory.
  const queue = new PQueue({ concurrency: availableParallelism() + 1 })
  const stays = turbines.map((frame) => ({ frame, days: daysOf(frame) }))
  const of = stays.reduce((sum, { days }) => sum + days.length, 0)
  let done = 0
  onProgress({ stage: 'examining', share: 0 })
  const examine = async (frame: TurbineFrame, dayMs: number): Promise<HighRateDay> => {
    signal.throwIfAborted()
    const span = await source.read(frame.turbine, channels, {
      fromMs: dayMs - DAY_MARGIN_MS,
      toMs: dayMs + DAY_MS + DAY_MARGIN_MS,
    })
    signal.throwIfAborted()
    const day = await parts.scorers.examine(highRateRows(frame, dayMs, span))
    onProgress({ stage: 'examining', share: ++done / of })
    return day
  }
  try {
    return await Promise.all(
      stays.map(async ({ frame, days }) => ({
        turbine: frame.turbine,
        days: await Promise.all(days.map((dayMs) => queue.add(() => examine(frame, dayMs), { signal }))),
      })),
    )
  } catch (error) {
    queue.clear()
    await queue.onIdle() // the file must not go while it is read
    throw error
  }
}

/** Days (UTC) on which a turbine has intervals, rising. */
function daysOf(frame: TurbineFrame): number[] {
  const days = new Set<number>()
  for (const ms of frame.time) days.add(Math.floor(ms / DAY_MS) * DAY_MS)
  return [...days]
}
