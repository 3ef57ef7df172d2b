/** Lengths of interval that loggers use, s. */
const USUAL_S = [
  1, 2, 4, 5, 10, 15, 20, 30, 60, 120, 180, 240, 300, 600, 900, 1200, 1800, 3600, 7200, 10_800, 21_600,
  86_400,
]
const NEAR_SHARE = 0.06
/** How far from its grid a stamp may stand: a twentieth of the interval, and half a minute at most. */
const TOLERANCE_SHARE = 0.05
const LARGEST_TOLERANCE_MS = 30_000
/** Share of all steps from which a second length of interval is worth a warning. */
const SECOND_SHARE = 0.05

export interface TimeGrid {
  readonly intervalMs: number
  readonly toleranceMs: number
}

/**
 * The grid that jittering stamps stand about; null when the stamps keep their distances, or none is usual.
 * @param steps  step between rows of a turbine, ms -> how often.
 */
export function findGrid(steps: ReadonlyMap<number, number>): TimeGrid | null {
  const middle = medianStep(steps)
  const intervalMs = usualNear(middle)
  if (intervalMs === null) return null
  const isKept = [...steps.keys()].every((step) => step % intervalMs === 0)
  if (isKept) return null
  return { intervalMs, toleranceMs: Math.min(TOLERANCE_SHARE * intervalMs, LARGEST_TOLERANCE_MS) }
}

/** The usual length next to `stepMs`, within 6 %; null when there is none. */
export function usualNear(stepMs: number): number | null {
  const near = USUAL_S.find((s) => Math.abs(stepMs - s * 1000) <= NEAR_SHARE * s * 1000)
  return near === undefined ? null : near * 1000
}

/** SQL of a time moved to its grid where it stands within the tolerance. */
export function snapSql(time: string, grid: TimeGrid): string {
  const point = gridPointSql(time, grid)
  return `CASE WHEN abs(${time} - ${point}) <= ${grid.toleranceMs} THEN ${point} ELSE ${time} END`
}

export function gridPointSql(time: string, { intervalMs }: TimeGrid): string {
  return `(((${time} + ${Math.floor(intervalMs / 2)}) // ${intervalMs}) * ${intervalMs})`
}

/**
 * Lengths of interval beside the commonest one, in words; null when there is none. Gaps are whole multiples and do not count.
 * @param overallMs  the commonest step.
 */
export function otherIntervals(
  steps: ReadonlyMap<number, number>,
  overallMs: number,
  byTurbine: ReadonlyMap<string, number>,
): string | null {
  const total = [...steps.values()].reduce((sum, n) => sum + n, 0)
  const own = new Set(byTurbine.values())
  const others = [...steps]
    .filter(
      ([step, n]) =>
        step !== overallMs && (own.has(step) || (n >= SECOND_SHARE * total && step % overallMs !== 0)),
    )
    .map(([step]) => step / 1000)
    .sort((a, b) => a - b)
  if (others.length === 0) return null
  return `time: rows follow each other mostly after ${overallMs / 1000} s, but also after ${others.slice(0, 5).join(', ')} s; intervals of different length are mixed`
}

function medianStep(steps: ReadonlyMap<number, number>): number {
  const sorted = [...steps].sort((a, b) => a[0] - b[0])
  const half = sorted.reduce((sum, [, n]) => sum + n, 0) / 2
  let seen = 0
  for (const [step, n] of sorted) {
    seen += n
    if (seen >= half) return step
  }
  return NaN
}
