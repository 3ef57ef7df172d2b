import type { TurbineSheet } from '../../sheet/index.ts'
import type { FittedExponent } from './fitted-exponent.ts'
import type { OffsetByCondition } from './offset-by-condition.ts'
import type { ReferenceOffset } from './reference-offset.ts'

type Conditions = TurbineSheet['staticOffset']['byCondition']

export const NO_CONDITIONS: Conditions = {
  groups: [],
  sameness: [],
  windSpeedSlope: null,
  curve: null,
  note: 'no offset, and so none by condition',
}

const BY_POWER =
  'from power: intervals hold the scatter between days; the response of the anemometer and the exponent move all groups alike and are not in them'

/** The offset by condition, as the sheet shows it. */
export function conditionsInSheet({ groups, sameness, slope, curve }: OffsetByCondition): Conditions {
  return {
    groups: groups.map((group) => ({
      condition: group.condition,
      label: group.label,
      fromMs: group.fromMs,
      toMs: group.toMs,
      rows: group.rows,
      days: group.days,
      estimateDeg: group.offsetDeg,
      standingMisalignmentDeg: group.standingDeg,
      interval95Deg: [group.offsetDeg - group.halfWidthDeg, group.offsetDeg + group.halfWidthDeg],
    })),
    sameness: sameness.map((test) => ({ ...test })),
    windSpeedSlope:
      slope === null
        ? null
        : {
            slopeDegPerMs: slope.slopeDegPerMs,
            slopeInterval95DegPerMs: [...slope.slopeInterval95],
            pValue: slope.pValue,
          },
    curve:
      curve === null
        ? null
        : curve.points.map((point) => ({
            windSpeedMs: point.windSpeedMs,
            standingMisalignmentDeg: point.standingDeg,
            interval95Deg: [point.standingDeg - point.halfWidthDeg, point.standingDeg + point.halfWidthDeg],
          })),
    note:
      curve === null
        ? BY_POWER
        : `the offset depends on wind speed: look for a damaged, loose or wrongly mounted vane first; ${BY_POWER}`,
  }
}

/** With a reference, what it says by wind speed stands in place of what power says. */
export function referenceConditions(byPower: Conditions, reference: ReferenceOffset): Conditions {
  return {
    ...byPower,
    groups: [
      ...reference.byWindSpeed.map((bin) => ({
        condition: 'wind-speed' as const,
        label: `${bin.fromMs} to ${bin.toMs} m/s, by the reference`,
        fromMs: bin.fromMs,
        toMs: bin.toMs,
        rows: bin.rows,
        days: bin.days,
        estimateDeg: bin.offsetDeg,
        standingMisalignmentDeg: bin.standingDeg,
        interval95Deg: [bin.offsetDeg - bin.halfWidthDeg, bin.offsetDeg + bin.halfWidthDeg],
      })),
      ...byPower.groups,
    ],
    note: `bins of the reference first; tests, slope and table ${byPower.note}`,
  }
}

/** A fitted exponent with the words that keep it from being used. */
export function exponentInSheet(
  fitted: FittedExponent | null,
): TurbineSheet['staticOffset']['fittedExponent'] {
  if (fitted === null) return null
  return {
    exponent: fitted.exponent,
    interval95: [fitted.exponent - fitted.halfWidth, fitted.exponent + fitted.halfWidth],
    note:
      'a diagnostic and no estimate to be used: vane noise flattens the bend that it is read from, an anemometer that bends ' +
      'with the vane changes it, and its interval holds neither',
  }
}
