import fc from 'fast-check'
import { expect, test } from 'vitest'
import { circularMedian, meanDeviation } from '../../../src/kernel/angle/index.ts'
import { gapDeg } from './gap-deg.ts'
import { REFERENCE_SETS } from './reference-sets.ts'

const RAD = Math.PI / 180
const setNamed = (name: string): readonly number[] => REFERENCE_SETS.find((set) => set.name === name)!.angles
const angles = fc.array(fc.double({ min: -720, max: 720, noNaN: true }), { minLength: 1, maxLength: 30 })
const wholeDegrees = fc.array(fc.integer({ min: -360, max: 360 }), { minLength: 1, maxLength: 12 })

/** Mean angular distance, degrees, by the definition and without the kernel. */
function meanDistance(data: readonly number[], from: number): number {
  return data.reduce((sum, angle) => sum + gapDeg(angle, from), 0) / data.length
}

test('books have the same median', () => {
  // Zar (2010), sec. 26.6: 103, and 110 without the first tree.
  expect(circularMedian([45, 55, 81, 96, 110, 117, 132, 154])).toBe(103)
  expect(circularMedian([55, 81, 96, 110, 117, 132, 154])).toBe(110)
  // Fisher (1993), p. 78, app. B.6 set 2.
  expect(circularMedian(setNamed('fisherB6_2'))).toBe(245)
  // Roulette: 52 in R as well.
  expect(circularMedian(setNamed('mj_roulette'))).toBe(52)
})

test('counts in classes, spread evenly over each class, give the interpolated median', () => {
  // Mardia (1972), mallards: 313.8 from 18 classes of 20 degrees.
  const counts = [40, 22, 20, 9, 6, 3, 3, 1, 6, 3, 11, 22, 24, 58, 136, 138, 143, 69]
  const mallards = counts.flatMap((count, i) =>
    Array.from({ length: count }, (_, j) => 20 * (i + (j + 0.5) / count)),
  )
  expect(mallards).toHaveLength(714)
  expect(Math.abs(circularMedian(mallards) - 313.8)).toBeLessThan(0.1) // half a class holds 71 birds: 0.14 each
})

test.each(REFERENCE_SETS)(
  '$name: least mean distance as in R',
  ({ angles: data, meanDeviationRad, medianR }) => {
    // R averages all angles that tie, so only the distance must agree where several do.
    expect(Math.abs(meanDeviation(data) * RAD - meanDeviationRad)).toBeLessThan(1e-12)
    const tied = data.filter((angle) => meanDistance(data, angle) < meanDeviationRad / RAD + 1e-9)
    if (new Set(tied).size === 1) expect(gapDeg(circularMedian(data), medianR)).toBeLessThan(1e-9)
  },
)

test('where an arc ties the median is its middle, not the mean of the angles in it', () => {
  expect(circularMedian(setNamed('zar_vtest'))).toBe(90.5) // R: 89.67 from 88, 88, 93
  expect(circularMedian(setNamed('fisherB11'))).toBe(2) // Pewsey et al. (2013): 2.3, from 1, 3, 3
  expect(circularMedian(setNamed('ncfrog'))).toBe(137.5) // 130 to 145, through 136 and opposite 316; R: 136.997
  expect(circularMedian([350, 20])).toBe(5)
})

test('the mean deviation of the sea stars is the printed one', () => {
  // Pewsey, Neuhaeuser & Ruxton (2013), ch. 3: 0.43 rad for Fisher's app. B.11.
  expect(Math.abs(meanDeviation(setNamed('fisherB11')) * RAD - 0.43)).toBeLessThan(0.005)
})

test('without one best direction there is no median', () => {
  for (const data of [
    [],
    [NaN],
    [0, 180],
    [0, 90, 180, 270],
    [0, 120, 240],
    [0, 0, 180, 180],
    [-50, 50, 180],
  ]) {
    expect(circularMedian(data), String(data)).toBeNaN()
    expect(meanDeviation(data), String(data)).toBeNaN()
  }
})

test('of several best arcs the one nearest the mean direction counts', () => {
  // By hand: 0 and 40 both have a summed distance of 260, 20 between them has 280. The mean is 26.6, nearer to 40.
  const data = [0, 0, 40, 60, 200]
  expect([0, 20, 40].map((from) => 5 * meanDistance(data, from))).toEqual([260, 280, 260])
  expect(circularMedian(data)).toBe(40)
  expect(meanDeviation(data)).toBe(52)
})

test('many angles close together and many all round', () => {
  // An odd number, evenly spaced over 60 degrees about north: the middle one, whatever the order.
  const cluster = Float64Array.from({ length: 20_001 }, (_, i) => (((i * 7919) % 20_001) - 10_000) * 0.003)
  expect(gapDeg(circularMedian(cluster), 0)).toBeLessThan(1e-9)
  // The same with a third as many spread evenly over the circle.
  const ring = Float64Array.from({ length: 6001 }, (_, i) => (i * 360) / 6001 - 0.001)
  expect(gapDeg(circularMedian([...cluster, ...ring]), 0)).toBeLessThan(0.005)
})

test('no direction lies nearer to the angles on average', () => {
  fc.assert(
    fc.property(fc.oneof(angles, wholeDegrees), (data) => {
      const median = circularMedian(data)
      fc.pre(!Number.isNaN(median))
      expect(median >= 0 && median < 360).toBe(true)
      const reached = meanDistance(data, median)
      // The least distance lies at an angle: between the kinks the distance is straight, and it bends down opposite one.
      const least = Math.min(...data.map((angle) => meanDistance(data, angle)))
      expect(reached).toBeLessThanOrEqual(least + 1e-9)
      expect(Math.abs(meanDeviation(data) - least)).toBeLessThan(1e-9)
    }),
    { numRuns: 500 },
  )
})

test('turning every angle turns the median by as much', () => {
  fc.assert(
    fc.property(
      fc.oneof(angles, wholeDegrees),
      fc.double({ min: -720, max: 720, noNaN: true }),
      (data, turn) => {
        const median = circularMedian(data)
        const turned = circularMedian(data.map((angle) => angle + turn))
        if (Number.isNaN(median)) expect(turned).toBeNaN()
        else expect(gapDeg(turned, median + turn)).toBeLessThan(1e-8)
      },
    ),
    { numRuns: 500 },
  )
})

test('order, missing values and whole turns do not matter', () => {
  fc.assert(
    fc.property(wholeDegrees, fc.integer({ min: -3, max: 3 }), (data, turns) => {
      const median = circularMedian(data)
      expect(circularMedian(data.toReversed())).toEqual(median)
      expect(circularMedian(data.flatMap((angle) => [NaN, angle]))).toEqual(median)
      expect(circularMedian(data.map((angle) => angle + 360 * turns))).toEqual(median)
    }),
  )
})

test('a cluster about north or about 180 gives the median of the line', () => {
  const offsets = [-20, -7, -1, 0.5, 3, 11, 30]
  for (const centre of [0, 360, 180, -180, 90]) {
    expect(
      gapDeg(circularMedian(offsets.map((offset) => centre + offset)), centre + 0.5),
      `centre ${centre}`,
    ).toBeLessThan(1e-12)
  }
})
