import type { TurbineSheet } from '../sheet/index.ts'
import { shrunkGroup } from './outlook.ts'

const NORMAL_95 = 1.959963984540054
/** Fewer turbines have nothing in common that chance could not give them. */
const LEAST_TURBINES = 3
/** Turbines are off by the same amount when they spread by less than this share of it. */
const ALIKE_SHARE = 1 / 3

/** Turbines that stand off by the same amount. */
export interface SharedOffset {
  /** `model M1`, or `the farm`. */
  readonly name: string
  readonly commonDeg: number
  readonly interval95Deg: readonly [number, number]
  readonly spreadDeg: number
  readonly members: readonly TurbineSheet[]
}

/**
 * What turbines of a model, or a whole farm, have in common. Such an offset is rarely the work of as many vanes: it comes
 * from a constant of the controller, from a correction for the flow behind the rotor, or from an anemometer whose response to
 * yaw is not known - and then from the estimate itself. The error that they share is not made smaller by their number.
 */
export function sharedOffsets(turbines: readonly TurbineSheet[], thresholdDeg: number): SharedOffset[] {
  const models = [...new Set(turbines.map(({ model }) => model))]
  if (models.length > 1) {
    const farm = sharedBy('the farm', turbines, thresholdDeg)
    if (farm !== null) return [farm]
  }
  return models.flatMap((model) => {
    const own = turbines.filter((turbine) => turbine.model === model)
    const name = model === null || models.length === 1 ? 'the farm' : `model ${model}`
    return sharedBy(name, own, thresholdDeg) ?? []
  })
}

function sharedBy(
  name: string,
  turbines: readonly TurbineSheet[],
  thresholdDeg: number,
): SharedOffset | null {
  const measured = turbines.filter(
    ({ verdict, staticOffset }) => verdict !== 'blocked' && staticOffset.standingMisalignmentDeg !== null,
  )
  if (measured.length < LEAST_TURBINES) return null
  const { commonDeg, commonSdDeg, spreadDeg, meanDeg } = shrunkGroup(measured)
  const sharedHalf =
    measured.reduce((sum, { staticOffset }) => sum + (staticOffset.intervalParts.response ?? 0), 0) /
    measured.length
  const half = Math.hypot(NORMAL_95 * commonSdDeg, sharedHalf)
  const isOff = Math.abs(commonDeg) >= thresholdDeg && Math.abs(commonDeg) - half > thresholdDeg / 2
  if (!isOff || !(spreadDeg <= ALIKE_SHARE * Math.abs(commonDeg))) return null
  const members = measured.filter((_, i) => Math.abs(meanDeg[i]! - commonDeg) < thresholdDeg)
  if (members.length < LEAST_TURBINES) return null
  return {
    name,
    commonDeg,
    interval95Deg: [commonDeg - half, commonDeg + half],
    spreadDeg,
    members,
  }
}
