import { expect, test } from 'vitest'
import { dayBlocks } from '../../../src/analysis/index.ts'
import { fittedExponent } from '../../../src/analysis/offset/fitted-exponent.ts'
import { fitOffset } from '../../../src/analysis/offset/offset-fit.ts'
import { offsetRows } from '../../../src/analysis/offset/offset-rows.ts'
import { frameOf, syntheticColumns, type Synthetic } from '../synthetic.ts'

function fitted(options: Synthetic) {
  const { frame, days } = frameOf(syntheticColumns(options))
  const rows = offsetRows(frame, days)
  const fit = fitOffset(rows, { exponent: 3, responsePerDeg: 0 })
  return fittedExponent(rows, fit, dayBlocks(days, { resamples: 300, seed: 1 }), days)
}

test('rows that follow the model exactly give their own exponent, whichever it was read with', () => {
  for (const exponent of [1.4, 2, 3]) {
    for (const offsetDeg of [-6, 0, 4]) {
      const answer = fitted({ exponent, offsetDeg, days: 20 })!
      // tan^2(d) tan^2(v) is left out of the model: 1.1 % of the bend at 6 degrees. Bins of the curve, with their own spread of
      // the vane, bend it by some per cent more.
      expect(Math.abs(answer.exponent / exponent - 1), `p ${exponent}, d ${offsetDeg}`).toBeLessThan(0.05)
    }
  }
})

test('in noise its interval holds the exponent, and is wide', () => {
  const answer = fitted({ exponent: 2, offsetDeg: 3, days: 40, noise: 0.05 })!
  expect(Math.abs(answer.exponent - 2)).toBeLessThan(1.5 * answer.halfWidth)
  expect(answer.halfWidth).toBeGreaterThan(0.1)
})

test('a vane that does not vary gives none', () => {
  expect(fitted({ vaneSdDeg: 0 })).toBeNull()
})
