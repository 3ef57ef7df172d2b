import { existsSync, readFileSync } from 'node:fs'
import { join } from 'node:path'
import fc from 'fast-check'
import { expect, test } from 'vitest'
import {
  bicPenalty,
  changeInterval,
  changePoints,
  differenceSd,
  mbicPenalty,
  meanCost,
  meanVarianceCost,
  partitionCost,
  penaltyPath,
  slopeCost,
  withLogLength,
  type SegmentCost,
} from '../../../src/kernel/stats/index.ts'
import { normals } from './normals.ts'

const CHECKS = join(import.meta.dirname, '..', '..', '..', '..', 'shared', 'checks', 'changepoint')
const withoutChecks = !existsSync(CHECKS)
const read = (file: string): unknown => JSON.parse(readFileSync(join(CHECKS, file), 'utf8'))

/** Annual flow of the Nile at Aswan, 1871 to 1970: Cobb (1978), Biometrika 65, 243-251; R's datasets::Nile. */
const NILE = [
  1120, 1160, 963, 1210, 1160, 1160, 813, 1230, 1370, 1140, 995, 935, 1110, 994, 1020, 960, 1180, 799, 958,
  1140, 1100, 1210, 1150, 1250, 1260, 1220, 1030, 1100, 774, 840, 874, 694, 940, 833, 701, 916, 692, 1020,
  1050, 969, 831, 726, 456, 824, 702, 1120, 1100, 832, 764, 821, 768, 845, 864, 862, 698, 845, 744, 796, 1040,
  759, 781, 865, 845, 944, 984, 897, 822, 1010, 771, 676, 649, 846, 812, 742, 801, 1040, 860, 874, 848, 890,
  744, 749, 838, 1050, 918, 986, 797, 923, 975, 815, 1020, 906, 901, 1170, 912, 746, 919, 718, 714, 740,
]
const meanOf = (values: readonly number[]): number =>
  values.reduce((sum, value) => sum + value, 0) / values.length
const squaresAbout = (values: readonly number[]): number =>
  values.reduce((sum, value) => sum + (value - meanOf(values)) ** 2, 0)

/** The best of all partitions, tried one by one. */
function byTrial(
  cost: SegmentCost,
  penalty: number,
  minLength: number,
): { changes: number[]; total: number } {
  let best = { changes: [] as number[], total: Infinity }
  const extend = (changes: number[], from: number): void => {
    const total = partitionCost(cost, changes) + penalty * changes.length
    if (total < best.total) best = { changes, total }
    for (let next = from + minLength; next <= cost.length - minLength; next++)
      extend([...changes, next], next)
  }
  extend([], 0)
  return best
}

test('the Nile fell after 1898, its 28th year, by the reference values', () => {
  // strucchange 1.5.3: break 28, means 1097.7500 and 849.9722, RSS 2835156.75 without and 1597457.19444 with it.
  const cost = meanCost(NILE)
  const { changes, cost: squares } = changePoints(cost, {
    penalty: 2 * Math.log(100) * differenceSd(NILE) ** 2,
  })
  expect(changes).toEqual([28])
  expect(meanOf(NILE.slice(0, 28))).toBeCloseTo(1097.75, 10)
  expect(meanOf(NILE.slice(28))).toBeCloseTo(849.972222222222, 9)
  expect(squares).toBeCloseTo(1597457.19444444, 6)
  expect(cost.of(0, 100)).toBeCloseTo(2835156.75, 6)
})

test('the place of the Nile’s change is known as far as the likelihood ratio rejects none other', () => {
  // Own definition, worked out here from sums about means: places whose squares exceed the least by at most
  // -2 ln(1 - sqrt(0.95)) = 7.3523 variances (7.35 in Hansen 2000, table 1). Bai (1997) with a variance for each
  // segment gives 25 to 32 (strucchange).
  const variance = 1597457.19444444 / 98
  const excess = (k: number): number =>
    (squaresAbout(NILE.slice(0, k)) + squaresAbout(NILE.slice(k)) - 1597457.19444444) / variance
  const kept = Array.from({ length: 99 }, (_, i) => i + 1).filter((k) => excess(k) <= 7.3523)
  expect(changeInterval(meanCost(NILE), { from: 0, to: 100, scale: variance })).toEqual({
    change: 28,
    low: kept[0],
    high: kept.at(-1),
  })
  expect([kept[0], kept.at(-1)]).toEqual([26, 29])
})

test('intervals of a change hold the true place at least as often as they say', () => {
  const draw = normals(4)
  for (const step of [0.7, 2]) {
    let held = 0
    for (let run = 0; run < 400; run++) {
      const values = Array.from({ length: 120 }, (_, i) => draw() + (i < 70 ? 0 : step))
      const { low, high } = changeInterval(meanCost(values), { from: 0, to: 120, scale: 1 })
      if (low <= 70 && 70 <= high) held++
    }
    // 0.95 less three standard deviations of a share of 400.
    expect(held / 400, `step ${step}`).toBeGreaterThan(0.95 - 3 * Math.sqrt((0.95 * 0.05) / 400))
  }
})

test('mean and variance of the Nile change after 4, 6 and 28 years, by the reference', () => {
  // R changepoint 2.x, PELT, MBIC: 4, 6, 28. Years 5 and 6 are alike by rounding; R's least variance is 1e-11.
  const cost = meanVarianceCost(NILE, 1e-11)
  const mbic = { penalty: mbicPenalty(100, 2), minLength: 2 }
  expect(changePoints(withLogLength(cost), mbic).changes).toEqual([4, 6, 28])
  expect(changePoints(cost, { penalty: 4 * Math.log(100), minLength: 2 }).changes).toEqual([4, 6, 28])
})

test('equal readings make no segment of their own when the variance has a believable floor', () => {
  const cost = meanVarianceCost(NILE, 50 ** 2)
  expect(changePoints(cost, { penalty: 4 * Math.log(100), minLength: 2 }).changes).toEqual([28])
})

test('the normal likelihood is that of the segment’s own mean and variance, by hand', () => {
  // 1 and 3: mean 2, variance 1: 2 ln(2 pi) + 2. With the floor at 4: 2 ln(8 pi) + 2 / 4.
  expect(meanVarianceCost([1, 3], 1e-9).of(0, 2)).toBeCloseTo(2 * Math.log(2 * Math.PI) + 2, 12)
  expect(meanVarianceCost([1, 3], 4).of(0, 2)).toBeCloseTo(2 * Math.log(8 * Math.PI) + 0.5, 12)
})

const ABSENT = withoutChecks ? ' (skipped: reference series are not here)' : ''
test.skipIf(withoutChecks)(
  `reference series of R’s changepoint package change where it says${ABSENT}`,
  () => {
    const series = read('r_rng_series.json') as Record<string, number[]>
    const found = (name: string, timesLog: number): readonly number[] => {
      const values = series[name]!
      return changePoints(meanCost(values), { penalty: bicPenalty(values.length, timesLog) }).changes
    }
    expect(found('one_change_5', 3)).toEqual([100])
    expect(found('one_change_10', 3)).toEqual([100])
    expect(found('three_changes', 3)).toEqual([50, 100, 150])
    expect(found('null_after_three', 3)).toEqual([])
    // Computed by an exact partition of another program.
    expect(found('jss2014_mean', 1)).toEqual([97, 192, 273, 353, 362, 366])
    expect(found('jss2014_mean', 1.5)).toEqual([97, 192, 273])
    expect(found('jss2014_mean', 2)).toEqual([97, 192])
  },
)

test.skipIf(withoutChecks)(`the path over all penalties is that of the reference${ABSENT}`, () => {
  const values = (read('r_rng_series.json') as Record<string, number[]>)['three_changes']!
  const path = penaltyPath(meanCost(values), { from: 4, to: 1500 })
  // R changepoint, CROPS on the same series, its package tests.
  const penalties = [4, 4.332496, 4.385247, 4.684254, 559.366988, 646.962719, 1311.335695]
  expect(path.map((step) => step.changes)).toEqual([
    [50, 96, 100, 133, 150, 159, 180],
    [50, 96, 100, 133, 150],
    [50, 100, 133, 150],
    [50, 100, 150],
    [50, 150],
    [50],
    [],
  ])
  path.forEach((step, i) => {
    expect(Math.abs(step.fromPenalty - penalties[i]!)).toBeLessThan(1e-6)
  })
  expect(path[3]!.cost).toBeCloseTo(169.38293418218808, 8)
})

test.skipIf(withoutChecks)(`quality control and a well log change where people see it${ABSENT}`, () => {
  const valuesOf = (file: string): number[] => (read(file) as { series: { raw: number[] }[] }).series[0]!.raw
  const quality = valuesOf('tcpd_quality_control_2.json')
  expect(changePoints(meanCost(quality), { penalty: 2 * Math.log(quality.length) }).changes).toEqual([97])

  const well = valuesOf('tcpd_well_log.json')
  const marks = (read('tcpd_annotations.json') as Record<string, Record<string, number[]>>)['well_log']!
  const penalty = 2 * 3 * Math.log(well.length) * differenceSd(well) ** 2
  const { changes } = changePoints(meanCost(well), { penalty, minLength: 5 })
  // Annotators 6, 7 and 8 agree on nine changes to one point.
  for (const mark of marks['7']!) {
    expect(
      changes.some((change) => Math.abs(change - mark) <= 2),
      `change near ${mark}`,
    ).toBe(true)
  }
})

const series = fc.array(fc.integer({ min: -6, max: 6 }), { minLength: 1, maxLength: 11 })
const options = {
  penalty: fc.double({ min: 0, max: 12, noNaN: true }),
  minLength: fc.integer({ min: 1, max: 4 }),
}

test('no partition of a series costs less than the one found', () => {
  const costs: [string, (values: number[]) => SegmentCost][] = [
    ['mean', meanCost],
    ['mean and variance', (values) => meanVarianceCost(values, 0.1)],
    ['with ln of length', (values) => withLogLength(meanCost(values))],
    [
      'slope',
      (values) =>
        slopeCost(
          values.map((value, i) => (i % 4 === 3 ? 0 : 1 + (Math.abs(value) % 3))),
          values.map((value, i) => (i % 4 === 3 ? 0 : value)),
          values.map((value) => value * value),
        ),
    ],
  ]
  fc.assert(
    fc.property(series, options.penalty, options.minLength, (values, penalty, minLength) => {
      for (const [name, costOf] of costs) {
        const cost = costOf(values)
        const found = changePoints(cost, { penalty, minLength })
        const best = byTrial(cost, penalty, minLength)
        // Rounding: a dozen terms of at most a few hundred.
        expect(found.cost + penalty * found.changes.length, name).toBeCloseTo(best.total, 9)
        const ends = [0, ...found.changes, values.length]
        if (found.changes.length > 0)
          ends.slice(1).forEach((end, i) => {
            expect(end - ends[i]!).toBeGreaterThanOrEqual(minLength)
          })
      }
    }),
    { numRuns: 150 },
  )
})

test('each partition of a path is the best from its penalty up to the next', () => {
  fc.assert(
    fc.property(series, (values) => {
      const cost = meanCost(values)
      const path = penaltyPath(cost, { from: 0.1, to: 500 })
      path.forEach((step, i) => {
        const next = path[i + 1]?.fromPenalty ?? 500
        const middle = (step.fromPenalty + next) / 2
        expect(step.cost + middle * step.changes.length).toBeCloseTo(byTrial(cost, middle, 1).total, 8)
      })
    }),
    { numRuns: 60 },
  )
})

test('a common level far above the noise leaves the changes where they are', () => {
  const draw = normals(9)
  const values = Array.from({ length: 300 }, (_, i) => draw() + (i < 130 ? 0 : 3))
  const raised = values.map((value) => value + 1e7)
  const penalty = 3 * Math.log(300)
  expect(changePoints(meanCost(values), { penalty }).changes).toHaveLength(1)
  expect(changePoints(meanCost(raised), { penalty }).changes).toEqual(
    changePoints(meanCost(values), { penalty }).changes,
  )
})

test('a long series with many changes is searched whole', () => {
  const draw = normals(12)
  const n = 100_000
  const values = Float64Array.from({ length: n }, (_, i) => draw() + 8 * (Math.floor(i / 200) % 2))
  const { changes } = changePoints(meanCost(values), { penalty: 3 * Math.log(n) })
  // A step of 8 standard deviations is misplaced with a probability of 1 - Phi(4) = 3e-5 to either side.
  const wanted = Array.from({ length: n / 200 - 1 }, (_, k) => 200 * (k + 1))
  expect(changes).toHaveLength(wanted.length)
  changes.forEach((change, k) => {
    expect(Math.abs(change - wanted[k]!)).toBeLessThanOrEqual(1)
  })
})

test('slopes of days change as those of their rows do', () => {
  const draw = normals(3)
  const rows = Array.from({ length: 400 }, (_, i) => {
    const x = draw()
    return { x, y: (i < 240 ? 1 : 1.6) * x + 0.3 * draw() }
  })
  const sums = (of: (row: { x: number; y: number }) => number): number[] =>
    Array.from({ length: 40 }, (_, day) => rows.slice(day * 10, day * 10 + 10).reduce((s, r) => s + of(r), 0))
  const cost = slopeCost(
    sums(({ x }) => x * x),
    sums(({ x, y }) => x * y),
    sums(({ y }) => y * y),
  )
  expect(changePoints(cost, { penalty: 0.09 * 3 * Math.log(40), minLength: 3 }).changes).toEqual([24])
  const slope =
    rows.slice(0, 240).reduce((s, r) => s + r.x * r.y, 0) /
    rows.slice(0, 240).reduce((s, r) => s + r.x * r.x, 0)
  const direct = rows.slice(0, 240).reduce((s, r) => s + (r.y - slope * r.x) ** 2, 0)
  expect(cost.of(0, 24)).toBeCloseTo(direct, 9)
})

test('the noise is that between changes', () => {
  const draw = normals(5)
  const values = Array.from({ length: 4000 }, (_, i) => 2 * draw() + 50 * Math.floor(i / 400))
  values[17] = NaN
  // Median deviation of 4000 overlapping differences: standard error below 3 %.
  expect(Math.abs(differenceSd(values) / 2 - 1)).toBeLessThan(0.09)
  expect(differenceSd([3])).toBeNaN()
})

test('series too short for a change have none', () => {
  expect(changePoints(meanCost([]), { penalty: 1 })).toEqual({ changes: [], cost: 0 })
  expect(changePoints(meanCost([1, 50, 90]), { penalty: 0, minLength: 2 }).changes).toEqual([])
})

test('wrong arguments are named', () => {
  const code = (name: string): unknown => expect.objectContaining({ code: name })
  expect(() => meanCost([1, NaN])).toThrow(code('OUT_OF_RANGE'))
  expect(() => meanVarianceCost([1], 0)).toThrow(code('OUT_OF_RANGE'))
  expect(() => slopeCost([1, 2], [1], [1, 2])).toThrow(code('LENGTH_MISMATCH'))
  expect(() => changePoints(meanCost([1]), { penalty: NaN })).toThrow(code('OUT_OF_RANGE'))
  expect(() => changePoints(meanCost([1]), { penalty: 1, minLength: 0 })).toThrow(code('OUT_OF_RANGE'))
  expect(() => changeInterval(meanCost([1]), { from: 0, to: 1, scale: 1 })).toThrow(code('OUT_OF_RANGE'))
  expect(() => changeInterval(meanCost([1, 2]), { from: 0, to: 2, scale: NaN })).toThrow(code('OUT_OF_RANGE'))
  expect(() => penaltyPath(meanCost([1, 2]), { from: 3, to: 3 })).toThrow(code('OUT_OF_RANGE'))
})
