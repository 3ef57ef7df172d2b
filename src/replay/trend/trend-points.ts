import type { FleetPoint, ScoreSheet, TrendPoint, TurbineSheet } from '../../sheet/index.ts'

/** One turbine in one window. */
export function trendPoint(sheet: ScoreSheet, turbine: TurbineSheet): TrendPoint {
  const { staticOffset, energyLoss } = turbine
  const produced = energyLoss.producedMwh
  return {
    replay: sheet.replay,
    ...windowOf(sheet),
    verdict: turbine.verdict,
    standingDeg: staticOffset.standingMisalignmentDeg,
    standingInterval95Deg: staticOffset.standingInterval95Deg,
    comparableHalfWidthDeg: comparableHalfWidth(staticOffset),
    staticPct: energyLoss.static.recoverablePctOfProduced,
    staticAnnualMwh: energyLoss.static.annualMwh,
    dynamicSdDeg: turbine.yawError.circularSdDeg,
    dynamicPct:
      produced !== null && produced > 0 && energyLoss.dynamic.windowMwh !== null
        ? (100 * energyLoss.dynamic.windowMwh) / produced
        : null,
    score: turbine.score,
    yawActivity: numbersOf(turbine.yawActivity),
  }
}

/**
 * Half-width of m at 95 % as far as two windows err apart from each other: scatter, the response as measured in each, and
 * the instrument. The exponent and what vane noise hides are the same in both, and cancel in a change.
 */
export function comparableHalfWidth(offset: TurbineSheet['staticOffset']): number | null {
  if (offset.standingMisalignmentDeg === null) return null
  const { statistical, response, instrument } = offset.intervalParts
  if (statistical !== null) return Math.hypot(statistical, response ?? 0, instrument ?? 0)
  const [low = null, high = null] = offset.standingInterval95Deg
  return low === null || high === null ? null : (high - low) / 2
}

/** The farm in one window. */
export function fleetPoint(sheet: ScoreSheet, points: readonly TrendPoint[]): FleetPoint {
  const count = (verdict: TurbineSheet['verdict']): number =>
    points.filter((point) => point.verdict === verdict).length
  const estimated = points.filter((point) => point.standingDeg !== null)
  const halves = estimated.map((point) => point.comparableHalfWidthDeg)
  const settled = points.filter(({ verdict }) => verdict === 'offset' || verdict === 'aligned')
  const names = [...new Set(points.flatMap(({ yawActivity }) => Object.keys(yawActivity)))].sort()
  return {
    replay: sheet.replay,
    ...windowOf(sheet),
    turbines: points.length,
    offset: count('offset'),
    aligned: count('aligned'),
    undetermined: count('undetermined'),
    blocked: count('blocked'),
    meanStandingDeg: mean(estimated.map((point) => point.standingDeg)),
    meanStandingHalfWidthDeg:
      halves.length === 0 || halves.includes(null)
        ? null
        : Math.hypot(...(halves as number[])) / halves.length,
    meanAbsStandingDeg: mean(estimated.map((point) => Math.abs(point.standingDeg ?? 0))),
    staticAnnualMwh:
      settled.length === 0 ? null : settled.reduce((sum, point) => sum + (point.staticAnnualMwh ?? 0), 0),
    dynamicSdDeg: mean(points.map((point) => point.dynamicSdDeg)),
    yawActivity: Object.fromEntries(
      names.map((name) => [name, mean(points.map(({ yawActivity }) => yawActivity[name] ?? null)) ?? 0]),
    ),
  }
}

function windowOf({ window }: ScoreSheet): { from: string; to: string } {
  return { from: window.from ?? '', to: window.to ?? '' }
}

function numbersOf(activity: TurbineSheet['yawActivity']): Record<string, number> {
  const numbers = Object.entries(activity).filter(
    (entry): entry is [string, number] => typeof entry[1] === 'number' && Number.isFinite(entry[1]),
  )
  return Object.fromEntries(numbers)
}

function mean(values: readonly (number | null)[]): number | null {
  const known = values.filter((value) => value !== null)
  return known.length === 0 ? null : known.reduce((sum, value) => sum + value, 0) / known.length
}
