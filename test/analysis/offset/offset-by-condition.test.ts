import { expect, test } from 'vitest'
import { dayBlocks } from '../../../src/analysis/index.ts'
import { offsetByCondition } from '../../../src/analysis/offset/offset-by-condition.ts'
import { fitOffset } from '../../../src/analysis/offset/offset-fit.ts'
import { offsetRows } from '../../../src/analysis/offset/offset-rows.ts'
import type { TurbineColumns } from '../../../src/frame/index.ts'
import { RAD, frameOf, syntheticColumns, type Synthetic } from '../synthetic.ts'

const MODEL = { exponent: 3, responsePerDeg: 0 }

function byCondition(columns: TurbineColumns, freeOf?: (i: number) => number) {
  const { frame, days } = frameOf(columns)
  const dayWeights = dayBlocks(days, { resamples: 300, seed: 1 })
  const free = freeOf ? { freeStream: Uint8Array.from(frame.time, (_, i) => freeOf(i)) } : {}
  const rows = offsetRows(frame, days)
  return offsetByCondition(frame, { rows, fit: fitOffset(rows, MODEL), dayWeights, ...free })
}

/** Power of a rotor whose offset is `offsetAt` of row i, from rows of one whose offset is 0. */
function withOffset(
  options: Synthetic,
  offsetAt: (i: number, columns: TurbineColumns) => number,
): TurbineColumns {
  const columns = syntheticColumns({ ...options, offsetDeg: 0 })
  const vane = columns.numbers['vane']!
  const power = columns.numbers['power']!.map((kw, i) => {
    const faced = Math.cos((vane[i]! + offsetAt(i, columns)) * RAD) / Math.cos(vane[i]! * RAD)
    return kw * faced ** 3
  })
  return { ...columns, numbers: { ...columns.numbers, power } }
}

test('one offset is found alike in every group, and no curve is reported', () => {
  const { groups, sameness, curve } = byCondition(
    syntheticColumns({ days: 40, offsetDeg: 5, noise: 0.03 }),
    (i) => i % 2,
  )
  expect(new Set(groups.map((group) => group.condition))).toEqual(
    new Set(['wind-speed', 'day-night', 'wake']),
  )
  const known = groups.filter((group) => !Number.isNaN(group.offsetDeg))
  expect(known.length).toBeGreaterThan(7)
  // Each group by itself covers the truth in 95 of 100 cases; twice the half-width is left once in ten thousand.
  for (const group of known) {
    expect(Math.abs(group.offsetDeg - 5), group.label).toBeLessThan(2 * group.halfWidthDeg)
  }
  expect(sameness.length).toBe(3)
  for (const test of sameness) expect(test.pValue, test.condition).toBeGreaterThan(0.001)
  expect(curve).toBe(null)
})

test('an offset that grows with wind speed comes back as a curve with its slope', () => {
  const columns = withOffset(
    { days: 40, noise: 0.02 },
    (i, { numbers }) => 2 * (numbers['wind_speed']![i]! - 8),
  )
  const { curve, sameness, slope } = byCondition(columns)
  expect(sameness.find((test) => test.condition === 'wind-speed')!.pValue).toBeLessThan(1e-4)
  expect(slope!.pValue).toBeLessThan(1e-4)
  const [low, high] = curve!.slopeInterval95
  // 2 degrees per m/s; twice the half-width is left once in ten thousand.
  expect(Math.abs(curve!.slopeDegPerMs - 2)).toBeLessThan(high - low)
  for (const point of curve!.points) {
    expect(Math.abs(point.offsetDeg - 2 * (point.windSpeedMs - 8))).toBeLessThan(2 * point.halfWidthDeg + 0.3)
  }
})

test('wakes with an offset of their own are told from the free stream', () => {
  const { groups, sameness } = byCondition(
    withOffset({ days: 40, noise: 0.02 }, (i) => (i % 2 === 1 ? 4 : -4)),
    (i) => i % 2,
  )
  const of = (label: string) => groups.find((group) => group.label === label)!
  expect(Math.abs(of('free stream').offsetDeg - 4)).toBeLessThan(2 * of('free stream').halfWidthDeg)
  expect(Math.abs(of('in or beside a wake').offsetDeg + 4)).toBeLessThan(
    2 * of('in or beside a wake').halfWidthDeg,
  )
  expect(sameness.find((test) => test.condition === 'wake')!.pValue).toBeLessThan(1e-6)
})

test('terciles of turbulence are groups where it is logged', () => {
  const columns = syntheticColumns({ days: 20, offsetDeg: 3, noise: 0.02 })
  const sd = columns.numbers['wind_speed']!.map((speed, i) => speed * (0.06 + 0.0004 * (i % 144)))
  const { groups } = byCondition({ ...columns, numbers: { ...columns.numbers, wind_speed_sd: sd } })
  const terciles = groups.filter((group) => group.condition === 'turbulence')
  expect(terciles.map((group) => group.label)).toEqual([
    'low turbulence',
    'middle turbulence',
    'high turbulence',
  ])
  for (const group of terciles) expect(Math.abs(group.offsetDeg - 3)).toBeLessThan(2 * group.halfWidthDeg)
})

test('groups of few rows or days have no offset, and a vane that never varies has no groups', () => {
  const { groups, sameness, slope } = byCondition(syntheticColumns({ days: 3, offsetDeg: 5 }))
  for (const group of groups) expect(group.offsetDeg).toBe(NaN)
  for (const test of sameness) expect(test.pValue).toBe(NaN)
  expect(slope).toBe(null)
  expect(byCondition(syntheticColumns({ vaneSdDeg: 0 })).groups).toEqual([])
})

test('groups that share an offset are called different about as often as the chance says', () => {
  let below = 0
  const farms = 16
  for (let seed = 1; seed <= farms; seed++) {
    const { sameness } = byCondition(
      syntheticColumns({ days: 16, offsetDeg: 4, noise: 0.04, dayNoise: 0.02, seed }),
    )
    for (const test of sameness) if (test.pValue < 0.05) below++
  }
  // Two tests a farm: 1.6 of 32 expected; more than 6 has a chance of 0.1 % (binomial).
  expect(below).toBeLessThanOrEqual(6)
})
