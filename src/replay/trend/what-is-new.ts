import type { ScoreSheet, TurbineSheet, WhatIsNew } from '../../sheet/index.ts'
import { comparableHalfWidth } from './trend-points.ts'

/**
 * What a sheet says that an earlier one of the same site did not: verdicts that changed, findings that came and went,
 * misalignments that moved by more than the combined error of the two, corrections with another outcome.
 *
 * @param before  null: there is none; then everything but an `aligned` turbine counts as new.
 */
export function whatIsNew(sheet: ScoreSheet, before: ScoreSheet | null): WhatIsNew {
  const old = new Map((before?.turbines ?? []).map((turbine) => [turbine.turbine, turbine]))
  const held = new Set(sheet.turbines.map(({ turbine }) => turbine))
  const pairs = sheet.turbines.map((now) => ({ now, was: old.get(now.turbine) ?? null }))
  return {
    replay: sheet.replay,
    since: before?.replay ?? null,
    verdicts: pairs
      .filter(({ now, was }) => now.verdict !== (was?.verdict ?? 'aligned'))
      .map(({ now, was }) => ({
        turbine: now.turbine,
        from: was?.verdict ?? null,
        to: now.verdict,
        reason: now.reason,
      })),
    findings: pairs.flatMap(({ now, was }) =>
      now.sensors
        .filter((one) => one.severity !== 'info' && !hasFinding(was, one))
        .map(({ sensor, kind, finding, severity }) => ({
          turbine: now.turbine,
          sensor,
          kind,
          finding,
          severity,
        })),
    ),
    gone: pairs.flatMap(({ now, was }) =>
      (was?.sensors ?? [])
        .filter((one) => one.severity !== 'info' && !hasFinding(now, one))
        .map(({ sensor, kind }) => ({ turbine: now.turbine, sensor, kind })),
    ),
    moved: pairs.flatMap(({ now, was }) => (was ? movedOf(now, was) : [])),
    corrections: correctionsOf(sheet, before),
    missing: [...old.keys()].filter((turbine) => !held.has(turbine)),
  }
}

/** Whether there is nothing to tell. */
export function isNothingNew(news: WhatIsNew): boolean {
  const { verdicts, findings, gone, moved, corrections, missing } = news
  return [verdicts, findings, gone, moved, corrections, missing].every(({ length }) => length === 0)
}

type Finding = TurbineSheet['sensors'][number]

function hasFinding(turbine: TurbineSheet | null, { sensor, kind }: Finding): boolean {
  return (turbine?.sensors ?? []).some((one) => one.sensor === sensor && one.kind === kind)
}

function movedOf(now: TurbineSheet, was: TurbineSheet): WhatIsNew['moved'] {
  const fromDeg = was.staticOffset.standingMisalignmentDeg
  const toDeg = now.staticOffset.standingMisalignmentDeg
  const halves = [comparableHalfWidth(was.staticOffset), comparableHalfWidth(now.staticOffset)]
  if (fromDeg === null || toDeg === null || halves.includes(null)) return []
  const changeDeg = wrapped(toDeg - fromDeg)
  const half = Math.hypot(...(halves as number[]))
  if (!(Math.abs(changeDeg) > half)) return []
  const interval95Deg = [changeDeg - half, changeDeg + half]
  return [{ turbine: now.turbine, fromDeg, toDeg, changeDeg, interval95Deg }]
}

/** [-180, 180); both were wrapped already. */
function wrapped(deg: number): number {
  return deg >= 180 ? deg - 360 : deg < -180 ? deg + 360 : deg
}

function correctionsOf(sheet: ScoreSheet, before: ScoreSheet | null): WhatIsNew['corrections'] {
  const key = ({ turbine, at, enteredDeg }: ScoreSheet['corrections'][number]): string =>
    JSON.stringify([turbine, at, enteredDeg])
  const old = new Map((before?.corrections ?? []).map((proof) => [key(proof), proof.outcome]))
  return sheet.corrections
    .map((proof) => ({
      turbine: proof.turbine,
      at: proof.at,
      from: old.get(key(proof)) ?? null,
      to: proof.outcome,
    }))
    .filter(({ from, to }) => from !== to)
}
