import { existsSync, readFileSync } from 'node:fs'
import path from 'node:path'
import { describe, expect, test } from 'vitest'
import {
  circularDispersion,
  circularKurtosis,
  circularMean,
  circularMedian,
  circularQuantiles,
  circularSd,
  circularSkewness,
  meanDeviation,
  meanDirectionInterval,
  RAD_PER_DEG,
  rayleighTest,
  vonMisesKappa,
  vonMisesKappaCorrected,
} from '../../../src/kernel/angle/index.ts'
import { gapDeg } from './gap-deg.ts'

const FOLDER = path.join(import.meta.dirname, '../../../../shared/checks/circular')

interface CheckFile {
  unit_stored: 'deg' | 'rad'
  data: number[]
  outputs: Record<string, { value: number | number[] }>
  closed_form: Record<string, number>
}

/** Type 7 in plain words: cut opposite the centre, sort, go p of the way from first to last. What lies on the cut comes first or last. */
function quantileAbout(
  centre: number,
  angles: readonly number[],
  probability: number,
  onCut: 'first' | 'last',
): number {
  const line = angles
    .map((angle) => {
      const difference = ((((angle - centre + 180) % 360) + 360) % 360) - 180
      return difference === -180 && onCut === 'last' ? 180 : difference
    })
    .sort((a, b) => a - b)
  const rank = probability * (line.length - 1)
  const [low, high] = [line[Math.floor(rank)]!, line[Math.ceil(rank)]!]
  return centre + low + (rank % 1) * (high - low)
}

describe.each(['fisherB3', 'fisherB7', 'wind'])('long data set %s', (name) => {
  const file = path.join(FOLDER, `${name}.json`)
  // Too long to be kept here, so the test needs the folder of check files beside the repository.
  test.skipIf(!existsSync(file))(
    'agrees with R 4.2.2 `circular` 0.4-95 (skipped without its check file)',
    () => {
      const { unit_stored, data, outputs, closed_form } = JSON.parse(readFileSync(file, 'utf8')) as CheckFile
      const angles = unit_stored === 'rad' ? data.map((angle) => angle / RAD_PER_DEG) : data
      const output = (key: string): number[] => [outputs[key]!.value].flat()
      const { direction, resultant, count } = circularMean(angles)
      expect(gapDeg(direction, output('mean_deg')[0]!)).toBeLessThan(1e-6)
      expect(Math.abs(resultant - closed_form.Rbar!)).toBeLessThan(1e-9)
      expect(Math.abs(circularSd(angles) - closed_form.circ_sd_deg!)).toBeLessThan(1e-9)
      expect(Math.abs(circularDispersion(angles) - closed_form.circ_dispersion_fisher_delta!)).toBeLessThan(
        1e-9,
      )
      expect(Math.abs(circularSkewness(angles) - closed_form.skewness_fisher!)).toBeLessThan(1e-9)
      expect(Math.abs(circularKurtosis(angles) - closed_form.kurtosis_fisher!)).toBeLessThan(1e-9)
      const interval = meanDirectionInterval(angles)
      expect(Math.abs(interval.halfWidth - closed_form.ci95_halfwidth_deg_asin!)).toBeLessThan(1e-8) // z = 1.959963985
      expect(Math.abs(vonMisesKappa(resultant) / closed_form.kappa_A1inv_root! - 1)).toBeLessThan(1e-6)
      expect(Math.abs(vonMisesKappa(resultant) / output('vm_mle')[1]! - 1)).toBeLessThan(0.01)
      const corrected = vonMisesKappaCorrected(resultant, count)
      expect(Math.abs(corrected / output('vm_mle_bias')[0]! - 1)).toBeLessThan(0.01)
      expect(gapDeg(circularMedian(angles), output('median_deg')[0]!)).toBeLessThan(1e-6)
      expect(Math.abs(meanDeviation(angles) * RAD_PER_DEG - output('meandeviation_rad')[0]!)).toBeLessThan(
        1e-9,
      )
      // R cuts the circle opposite the median, and what lies exactly there comes last; the two cuts differ in effect for `wind` alone.
      const median = circularMedian(angles)
      const probabilities = [0.05, 0.25, 0.5, 0.75, 0.95]
      const quantiles = circularQuantiles(angles, probabilities)
      output('quantiles_deg').forEach((quantile, i) => {
        const probability = probabilities[i]!
        expect(gapDeg(quantileAbout(median, angles, probability, 'last'), quantile)).toBeLessThan(1e-6)
        const own = quantileAbout(direction, angles, probability, 'first')
        expect(gapDeg(quantiles[i]!, own)).toBeLessThan(1e-9)
        if (name !== 'wind') expect(gapDeg(quantiles[i]!, quantile)).toBeLessThan(1e-6)
      })
      const { z, p } = rayleighTest(angles)
      expect(Math.abs(z - closed_form.rayleigh_Z!)).toBeLessThan(1e-9)
      expect(Math.abs(p / closed_form.rayleigh_p_zar_approx! - 1)).toBeLessThan(1e-9)
    },
  )
})
