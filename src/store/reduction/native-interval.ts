import type { Connection } from '../../duck/index.ts'
import { BIN_SQL, REDUCED_INTERVAL_S } from './high-rate.ts'

const DAY_MS = 86_400_000
const BIN_MS = REDUCED_INTERVAL_S * 1000
/** One interval of so many is looked at: six a day say what the step is, and cost little. */
const SAMPLED = 24
/** Logs shorter than this are looked at whole, ms. */
const SHORT_MS = 2 * DAY_MS

/**
 * How many rows an interval of a turbine should hold, day by day (UTC): from the commonest step between rows inside
 * intervals. A log that changes its rate, or turbines of different rates, are each measured by their own.
 *
 * @param source  SQL after FROM, rows of one turbine with `time`
 * @param fallbackS  where no two rows fall into one interval, s
 * @returns rows expected in the interval that starts at a time, 1 or more
 */
export async function expectedRows(
  connection: Connection,
  source: string,
  where: string,
  about: { spanMs: number; fallbackS: number },
): Promise<(binMs: number) => number> {
  const sample = about.spanMs <= SHORT_MS ? '' : `AND (${BIN_SQL} // ${BIN_MS}) % ${SAMPLED} = 0`
  const steps = await connection.records(
    `SELECT bin - ((bin % ${DAY_MS}) + ${DAY_MS}) % ${DAY_MS} AS day_ms, step, count(*) AS steps
     FROM (SELECT bin, time - lag(time) OVER (PARTITION BY bin ORDER BY time) AS step
           FROM (SELECT time, ${BIN_SQL} AS bin FROM ${source} WHERE ${where} ${sample}))
     WHERE step > 0 GROUP BY ALL ORDER BY day_ms, step`,
  )
  const overall = new Map<number, number>()
  const byDay = new Map<number, Map<number, number>>()
  for (const row of steps) {
    const [dayMs, step, count] = [row['day_ms'] as number, row['step'] as number, row['steps'] as number]
    overall.set(step, (overall.get(step) ?? 0) + count)
    const day = byDay.get(dayMs) ?? new Map<number, number>()
    byDay.set(dayMs, day.set(step, count))
  }
  const usualMs = commonest(overall) ?? about.fallbackS * 1000
  const stepByDay = new Map([...byDay].map(([dayMs, counts]) => [dayMs, commonest(counts)]))
  return (binMs) => {
    const stepMs = stepByDay.get(Math.floor(binMs / DAY_MS) * DAY_MS) ?? usualMs
    return Math.max(1, BIN_MS / stepMs)
  }
}

/** Of equally common steps the shorter one. */
function commonest(counts: ReadonlyMap<number, number>): number | undefined {
  let best: number | undefined
  for (const [step, count] of [...counts].sort((a, b) => a[0] - b[0])) {
    if (best === undefined || count > counts.get(best)!) best = step
  }
  return best
}
