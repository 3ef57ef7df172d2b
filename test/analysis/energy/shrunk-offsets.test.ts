import { expect, test } from 'vitest'
import { costAt, probabilityBeyond, shrunkOffsets } from '../../../src/analysis/index.ts'
import { lossShare } from '../../../src/kernel/wind/index.ts'
import { normals } from '../../kernel/stats/normals.ts'

test('the largest of many estimates is drawn in, and drawing in brings it nearer to the truth', () => {
  const draw = normals(7)
  let asRead = 0
  let shrunken = 0
  for (let farm = 0; farm < 40; farm++) {
    const truth = Array.from({ length: 12 }, () => 4 * draw())
    const measured = truth.map((deg) => ({ standingDeg: deg + 2 * draw(), halfDeg: 2 * 1.96 }))
    const { meanDeg } = shrunkOffsets(measured)
    const size = (deg: number): number => Math.abs(deg)
    const largest = measured.reduce(
      (best, { standingDeg }, i) => (size(standingDeg) > size(measured[best]!.standingDeg) ? i : best),
      0,
    )
    asRead += size(measured[largest]!.standingDeg) - size(truth[largest]!)
    shrunken += size(meanDeg[largest]!) - size(truth[largest]!)
  }
  // The luck of the largest of twelve with an error of 2 degrees: some 0.7 degrees on average; the rest of it is chance (2 / sqrt 40).
  expect(asRead / 40).toBeGreaterThan(0.4)
  expect(Math.abs(shrunken / 40)).toBeLessThan(0.6)
  expect(Math.abs(shrunken)).toBeLessThan(Math.abs(asRead))
})

test('a turbine that is not measured gets what its farm has in common', () => {
  const { meanDeg, sdDeg, commonDeg } = shrunkOffsets([
    { standingDeg: 1, halfDeg: 1 },
    { standingDeg: NaN, halfDeg: NaN },
    { standingDeg: 3, halfDeg: 1 },
  ])
  expect(meanDeg[1]).toBeCloseTo(commonDeg, 9)
  expect(sdDeg[1]).toBeGreaterThan(sdDeg[0]!)
})

test('probabilities beyond a threshold count both sides', () => {
  expect(probabilityBeyond(0, 3, 3)).toBeCloseTo(0.3173105, 6) // 2 (1 - Phi(1))
  expect(probabilityBeyond(3, 1e-6, 3)).toBeCloseTo(0.5, 6)
  expect(probabilityBeyond(-9, 1, 3)).toBeCloseTo(1, 6)
  expect(probabilityBeyond(NaN, 1, 3)).toBeNaN()
})

test('a cost between known ones follows 1 - cos^p, on the side of its sign', () => {
  const cost = (deg: number): number => (deg < 0 ? 50 : 80) * lossShare(deg, 3)
  const points = [-9, -6, -3, 3, 6, 9].map((standingDeg) => ({ standingDeg, cost: cost(standingDeg) }))
  for (const deg of [-14, -7.4, -1, 0.2, 4.5, 9, 12]) expect(costAt(points, deg, 3)).toBeCloseTo(cost(deg), 9)
  expect(costAt(points, 0, 3)).toBe(0)
  expect(costAt([], 4, 3)).toBeNaN()
})
