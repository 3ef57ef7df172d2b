import { trendLine, type TrendValue } from '../../analysis/index.ts'
import type { FleetPoint, ScoreSheet, Trend, TrendLine, TrendPoint } from '../../sheet/index.ts'
import { fleetPoint, trendPoint } from './trend-points.ts'
import { whatIsNew } from './what-is-new.ts'

/** Windows that share more of the shorter one are one and the same month, scored twice. */
const SAME_WINDOW_SHARE = 0.1

/**
 * Months compared: offset, loss, dynamic error and yaw wear of each turbine and of the fleet over the windows that sheets
 * hold, with straight lines through them, and what the newest sheet says that the one before it did not. Of windows that
 * overlap, the sheet that was made last counts, turbine by turbine.
 *
 * @param sheets  of one site, newest made first.
 */
export function trendOf(site: string, sheets: readonly ScoreSheet[]): Trend {
  const names = [...new Set(sheets.flatMap(({ turbines }) => turbines.map(({ turbine }) => turbine)))].sort()
  const bySheet = new Map<ScoreSheet, TrendPoint[]>()
  const turbines = names.map((turbine) => {
    const taken = apart(sheets.filter((sheet) => sheet.turbines.some((one) => one.turbine === turbine)))
    const points = taken.map((sheet) => {
      const point = trendPoint(
        sheet,
        sheet.turbines.find((one) => one.turbine === turbine)!,
      )
      bySheet.set(sheet, [...(bySheet.get(sheet) ?? []), point])
      return point
    })
    return { turbine, points, lines: turbineLines(points) }
  })
  const fleet = apart([...sheets].filter((sheet) => bySheet.has(sheet))).map((sheet) =>
    fleetPoint(sheet, bySheet.get(sheet)!),
  )
  return {
    site,
    turbines,
    fleet: { points: fleet, lines: fleetLines(fleet) },
    new: sheets[0] ? whatIsNew(sheets[0], sheets[1] ?? null) : null,
  }
}

/** Sheets whose windows do not overlap, the newest made first to be taken; answered in the order of their windows. */
function apart(sheets: readonly ScoreSheet[]): ScoreSheet[] {
  const taken: { sheet: ScoreSheet; fromMs: number; toMs: number }[] = []
  for (const sheet of sheets) {
    if (sheet.window.from === null || sheet.window.to === null) continue
    const [fromMs, toMs] = [Date.parse(sheet.window.from), Date.parse(sheet.window.to)]
    const isNew = taken.every((other) => {
      const shared = Math.min(toMs, other.toMs) - Math.max(fromMs, other.fromMs)
      return !(shared > SAME_WINDOW_SHARE * Math.min(toMs - fromMs, other.toMs - other.fromMs))
    })
    if (isNew) taken.push({ sheet, fromMs, toMs })
  }
  return taken.sort((a, b) => a.fromMs - b.fromMs).map(({ sheet }) => sheet)
}

function turbineLines(points: readonly TrendPoint[]): TrendLine[] {
  const of = (quantity: string, valueOf: (point: TrendPoint) => Pair): TrendLine[] =>
    lineOf(quantity, points, valueOf)
  return [
    ...of('standingDeg', (point) => [point.standingDeg, point.comparableHalfWidthDeg]),
    ...of('staticPct', (point) => [point.staticPct, null]),
    ...of('dynamicSdDeg', (point) => [point.dynamicSdDeg, null]),
    ...of('dynamicPct', (point) => [point.dynamicPct, null]),
    ...activityLines(points),
  ]
}

function fleetLines(points: readonly FleetPoint[]): TrendLine[] {
  const of = (quantity: string, valueOf: (point: FleetPoint) => Pair): TrendLine[] =>
    lineOf(quantity, points, valueOf)
  return [
    ...of('meanStandingDeg', (point) => [point.meanStandingDeg, point.meanStandingHalfWidthDeg]),
    ...of('meanAbsStandingDeg', (point) => [point.meanAbsStandingDeg, null]),
    ...of('staticAnnualMwh', (point) => [point.staticAnnualMwh, null]),
    ...of('dynamicSdDeg', (point) => [point.dynamicSdDeg, null]),
    ...activityLines(points),
  ]
}

function activityLines(points: readonly (TrendPoint | FleetPoint)[]): TrendLine[] {
  const names = [...new Set(points.flatMap(({ yawActivity }) => Object.keys(yawActivity)))].sort()
  return names.flatMap((name) =>
    lineOf(`yawActivity.${name}`, points, ({ yawActivity }) => [yawActivity[name] ?? null, null]),
  )
}

type Pair = readonly [value: number | null, halfWidth: number | null]

function lineOf<P extends { readonly from: string; readonly to: string }>(
  quantity: string,
  points: readonly P[],
  valueOf: (point: P) => Pair,
): TrendLine[] {
  const values = points.map((point): TrendValue => {
    const [value, halfWidth] = valueOf(point)
    return {
      atMs: (Date.parse(point.from) + Date.parse(point.to)) / 2,
      value: value ?? NaN,
      halfWidth: halfWidth ?? NaN,
    }
  })
  const line = trendLine(quantity, values)
  return line ? [line] : []
}
