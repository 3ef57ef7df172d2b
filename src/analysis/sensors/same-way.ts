import { medianOf, robustSd } from '../../kernel/stats/index.ts'
import type { TurbineSheet } from '../../sheet/index.ts'

/** So many turbines, and this share of them, must stand off to one side before one cause is likelier than as many. */
const LEAST_TURBINES = 3
const ONE_SIDE_SHARE = 0.75

/** Turbines of one model that stand off the wind the same way. */
export interface SameWay {
  readonly model: string
  readonly turbines: number
  /** Median standing misalignment, degrees. */
  readonly medianDeg: number
  /** Robust standard deviation between them, degrees. */
  readonly spreadDeg: number
}

/**
 * Models whose turbines stand off the wind the same way: by at least the threshold as a median, three of four on that
 * side, and less apart from one another than from 0. One cause is likelier then than as many vanes that were mounted wrong.
 *
 * @param thresholdDeg  the misalignment that calls for action
 */
export function offSameWay(
  turbines: readonly Pick<TurbineSheet, 'model' | 'staticOffset'>[],
  thresholdDeg: number,
): Map<string | null, SameWay> {
  const byModel = new Map<string | null, number[]>()
  for (const { model, staticOffset } of turbines) {
    const standing = staticOffset.standingMisalignmentDeg
    if (standing === null) continue
    byModel.set(model, [...(byModel.get(model) ?? []), standing])
  }
  const found = new Map<string | null, SameWay>()
  for (const [model, values] of byModel) {
    const medianDeg = medianOf(values)
    const spreadDeg = robustSd(values)
    const oneSide = values.filter((value) => value * medianDeg > 0).length
    if (
      values.length >= LEAST_TURBINES &&
      Math.abs(medianDeg) >= thresholdDeg &&
      oneSide >= ONE_SIDE_SHARE * values.length &&
      spreadDeg < Math.abs(medianDeg)
    ) {
      found.set(model, { model: model ?? 'not named', turbines: values.length, medianDeg, spreadDeg })
    }
  }
  return found
}
