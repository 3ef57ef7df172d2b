import { expect, test } from 'vitest'
import {
  meanDirectionInterval,
  meanDirectionIntervalVonMises,
  vonMisesKappa,
} from '../../../src/kernel/angle/index.ts'
import { gapDeg } from './gap-deg.ts'
import { REFERENCE_SETS } from './reference-sets.ts'

const TREES = [45, 55, 81, 96, 110, 117, 132, 154]

test.each(REFERENCE_SETS)('$name: half-width of the large-sample interval', ({ angles, halfWidthDeg }) => {
  const { halfWidth, count } = meanDirectionInterval(angles)
  expect(Math.abs(halfWidth - halfWidthDeg)).toBeLessThan(1e-8) // made with z = 1.959963985
  expect(count).toBe(angles.length)
})

test('the printed intervals come out', () => {
  // Fisher (1993), p. 78: [232.7, 262.5] for app. B.6 set 2.
  const crossBeds = REFERENCE_SETS.find(({ name }) => name === 'fisherB6_2')!
  const large = meanDirectionInterval(crossBeds.angles)
  expect(Math.abs(large.direction - large.halfWidth - 232.7)).toBeLessThan(0.05)
  expect(Math.abs(large.direction + large.halfWidth - 262.5)).toBeLessThan(0.05)
  // Zar (2010), ex. 26.6: acos(0.85776) = 31, so 68 to 130.
  const small = meanDirectionIntervalVonMises(TREES)
  expect(Math.abs(Math.cos((small.halfWidth * Math.PI) / 180) - 0.85776)).toBeLessThan(5e-5)
  expect(Math.abs(small.direction - small.halfWidth - 68)).toBeLessThan(0.5)
  expect(Math.abs(small.direction + small.halfWidth - 130)).toBeLessThan(0.5)
})

test('both intervals close in on that of the line as angles close in', () => {
  // For a small spread s both are z s / sqrt(n), s^2 with divisor n; the second chi-square form is wider by terms of 1 / n.
  const data = Array.from({ length: 400 }, (_, i) => 200 + 4 * Math.sin(i))
  const offsets = data.map((angle) => angle - 200)
  const mean = offsets.reduce((sum, d) => sum + d, 0) / 400
  const sd = Math.sqrt(offsets.reduce((sum, d) => sum + (d - mean) ** 2, 0) / 400)
  const expected = (1.959963984540054 * sd) / 20
  expect(Math.abs(meanDirectionInterval(data).halfWidth / expected - 1)).toBeLessThan(0.005)
  expect(Math.abs(meanDirectionIntervalVonMises(data).halfWidth / expected - 1)).toBeLessThan(0.01)
})

test('on either side of the change-over the form for von Mises angles errs to the wide side', () => {
  // Pairs at +-g have a resultant of cos g. By hand, for large n and r = 0.9, where asin(z / sqrt(n kappa r)) is right:
  // cos^2 is 1 - c (1 / (2 r^2) - 1 / 4) below and 1 - c (1 - r^2) / r^2 above, c = z^2 / n; 1.324 and 1.058 times too wide.
  const n = 100_000
  const pairs = (r: number): number[] =>
    Array.from({ length: n }, (_, i) => ((i % 2 ? 1 : -1) * Math.acos(r) * 180) / Math.PI)
  const right = (r: number): number =>
    (Math.asin(1.959963984540054 / Math.sqrt(n * vonMisesKappa(r) * r)) * 180) / Math.PI
  const [below, above] = [0.8999, 0.9001].map(
    (r) => meanDirectionIntervalVonMises(pairs(r)).halfWidth / right(r),
  )
  expect(Math.abs(below! - 1.324)).toBeLessThan(0.002)
  expect(Math.abs(above! - 1.058)).toBeLessThan(0.002)
})

test('a larger quantile widens the interval until the whole circle is open', () => {
  expect(meanDirectionInterval(TREES, 2.5758).halfWidth).toBeGreaterThan(
    meanDirectionInterval(TREES).halfWidth,
  )
  expect(meanDirectionInterval(TREES, 10).halfWidth).toBe(180)
  for (const z of [4, 4.6, 6, 10, 100]) {
    expect(meanDirectionIntervalVonMises(TREES, z).halfWidth, `z ${z}`).toBe(180)
  }
  // Two clear clusters with a weak mean: the data leave every direction open.
  const open = [0, 0, 0, 170, 180, 190]
  expect(meanDirectionInterval(open).halfWidth).toBe(180)
  expect(meanDirectionIntervalVonMises(open).halfWidth).toBe(180)
  expect(gapDeg(meanDirectionInterval(open).direction, 0)).toBeLessThan(1e-9)
})

test('one angle, none, or angles that cancel have no interval', () => {
  for (const f of [meanDirectionInterval, meanDirectionIntervalVonMises]) {
    expect(f([40]), f.name).toEqual({ direction: expect.closeTo(40, 9) as number, halfWidth: NaN, count: 1 })
    expect(f([]), f.name).toEqual({ direction: NaN, halfWidth: NaN, count: 0 })
    expect(f([0, 180]), f.name).toEqual({ direction: NaN, halfWidth: NaN, count: 2 })
    expect(f([10, NaN, 20]).halfWidth, f.name).toBe(f([10, 20]).halfWidth)
  }
})

test('a quantile that is not above 0 is refused', () => {
  for (const f of [meanDirectionInterval, meanDirectionIntervalVonMises]) {
    for (const z of [0, -1, NaN]) {
      expect(() => f(TREES, z), f.name).toThrow(expect.objectContaining({ code: 'OUT_OF_RANGE' }))
    }
  }
})
