import type { TurbineSheet, WorklistEntry } from '../sheet/index.ts'
import { DESK_CHECK, mayEnter } from './advice.ts'
import { CAUTIONS } from './cautions.ts'

/** Turbines that stand off the wind, the costliest first. A turbine that stands right is not on it. */
export function worklistOf(turbines: readonly TurbineSheet[]): WorklistEntry[] {
  return turbines
    .filter((turbine) => turbine.verdict === 'offset')
    .map((turbine): WorklistEntry => ({
      turbine: turbine.turbine,
      standingMisalignmentDeg: turbine.staticOffset.standingMisalignmentDeg,
      addToVaneDeg: mayEnter(turbine.staticOffset, turbine.verdict)
        ? turbine.staticOffset.standingMisalignmentDeg
        : null,
      expectedAnnualMwh: turbine.energyLoss.static.annualMwh,
      interval95Mwh: turbine.energyLoss.static.annualInterval95Mwh,
      why: turbine.reason,
      checkFirst: DESK_CHECK,
      cautions: [...CAUTIONS],
    }))
    .sort(
      (a, b) => (b.expectedAnnualMwh ?? 0) - (a.expectedAnnualMwh ?? 0) || (a.turbine < b.turbine ? -1 : 1),
    )
}
