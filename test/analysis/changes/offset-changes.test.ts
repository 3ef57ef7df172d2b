import { expect, test } from 'vitest'
import { headingSteps } from '../../../src/analysis/changes/offset-changes-heading.ts'
import { blockNoise } from '../../../src/analysis/changes/offset-changes-noise.ts'
import { offsetChanges, type OffsetHistory } from '../../../src/analysis/changes/offset-changes.ts'
import type { Frame } from '../../../src/frame/index.ts'
import { normals } from '../../kernel/stats/normals.ts'
import { DAY_MS, FIRST_MS, madeFarm, stepAt } from './offset-changes-farm.ts'

const STEP_DAY = 10.4
const STEP_MS = FIRST_MS + STEP_DAY * DAY_MS
const DAYS = 24
const STEADY = [{ northDeg: () => 40 }, { offsetDeg: () => 3 }, { northDeg: () => -120 }]

function histories(frame: Frame, eventsMs: readonly number[] = []): OffsetHistory[] {
  const heading = headingSteps(frame)
  return frame.turbines.map((turbine, i) =>
    offsetChanges({
      turbine,
      days: frame.calendar.days,
      exponent: 3,
      heading: heading[i]!,
      eventsMs: i === 0 ? eventsMs : [],
    }),
  )
}

/** A moment and an interval of time hold the step: a date by rows is good to an hour or two here. */
function expectDated(change: { atMs: number }, [from, to]: readonly [number, number]): void {
  expect(Math.abs(change.atMs - STEP_MS)).toBeLessThan(DAY_MS / 12)
  expect(from).toBeLessThanOrEqual(STEP_MS)
  expect(to).toBeGreaterThanOrEqual(STEP_MS)
}

test('a vane that is knocked has two offsets, dated by the heading and confirmed by power', () => {
  const [knocked, ...others] = histories(
    madeFarm(DAYS, [{ offsetDeg: stepAt(STEP_DAY, -1, 6) }, ...STEADY]),
  ) as [OffsetHistory, ...OffsetHistory[]]
  expect(knocked.changes).toHaveLength(1)
  const change = knocked.changes[0]!
  expect(change.seenIn).toBe('both')
  expectDated(change, change.interval)
  const [low, high] = change.sizeInterval95Deg
  expect(low).toBeLessThan(7)
  expect(high).toBeGreaterThan(7)
  // Local noise of 2 degrees over a thousand rows: 0.1 degrees; power with 2 % of noise: 0.2.
  expect(Math.abs(change.sizeDeg - 7)).toBeLessThan(0.4)
  expect(Math.abs(change.fromDeg + 1)).toBeLessThan(0.8)
  expect(Math.abs(change.toDeg - 6)).toBeLessThan(0.8)
  expect(change.toDeg - change.fromDeg).toBeCloseTo(change.sizeDeg, 10)
  expect(knocked.segments.map(({ estimate }) => estimate)).toEqual([0, 0])
  expect(knocked.segments[1]!.fromMs).toBe(change.atMs)
  expect(knocked.positionSteps).toEqual([])
  for (const other of others) {
    expect(other.changes).toEqual([])
    expect(other.positionSteps).toEqual([])
    expect(other.segments).toHaveLength(1)
  }
})

test('a position sensor that slips is no change of the offset', () => {
  const [slipped, ...others] = histories(
    madeFarm(DAYS, [{ offsetDeg: () => 2, northDeg: stepAt(STEP_DAY, 15, 8) }, ...STEADY]),
  ) as [OffsetHistory, ...OffsetHistory[]]
  expect(slipped.changes).toEqual([])
  expect(slipped.positionSteps).toHaveLength(1)
  const step = slipped.positionSteps[0]!
  expectDated(step, step.intervalMs)
  expect(Math.abs(step.sizeDeg + 7)).toBeLessThan(0.4)
  expect(Math.abs(slipped.segments[0]!.offsetDeg - 2)).toBeLessThan(0.8)
  for (const other of others) expect([...other.changes, ...other.positionSteps]).toEqual([])
})

test('a step of the heading may cross 180 degrees', () => {
  // A farm whose other turbines have no north offset: readings against them run from 95 over 180 to -90, and so on.
  for (const [before, after, size] of [
    [95, 270, 175],
    [178, 184, 6],
    [-175, -185, -10],
    [20, 210, -170],
  ] as const) {
    const frame = madeFarm(DAYS, [{ northDeg: stepAt(STEP_DAY, before, after) }, {}, {}, {}])
    const [stepped, ...others] = headingSteps(frame)
    expect(stepped!.steps, `${before} to ${after}`).toHaveLength(1)
    expect(Math.abs(stepped!.steps[0]!.sizeDeg - size)).toBeLessThan(0.4)
    expectDated(stepped!.steps[0]!, stepped!.steps[0]!.intervalMs)
    for (const other of others) expect(other!.steps).toEqual([])
  }
})

test('steps of two turbines on different days are told apart', () => {
  const frame = madeFarm(DAYS, [
    { northDeg: stepAt(STEP_DAY, 0, 60) },
    { northDeg: stepAt(15, 0, -9) },
    {},
    {},
  ])
  const steps = headingSteps(frame).map((record) => record!.steps)
  expect(steps.map((list) => list.length)).toEqual([1, 1, 0, 0])
  expect(Math.abs(steps[0]![0]!.sizeDeg - 60)).toBeLessThan(0.4)
  expect(Math.abs(steps[1]![0]!.sizeDeg + 9)).toBeLessThan(0.4)
  expect(Math.abs(steps[1]![0]!.atMs - FIRST_MS - 15 * DAY_MS)).toBeLessThan(DAY_MS / 12)
})

test('without nacelle position power alone finds the change, to a few days', () => {
  const made = [{ offsetDeg: stepAt(STEP_DAY, -1, 6) }, ...STEADY].map((one) => ({ ...one, position: false }))
  const frame = madeFarm(DAYS, made)
  expect(headingSteps(frame)).toEqual([null, null, null, null])
  const [knocked, ...others] = histories(frame) as [OffsetHistory, ...OffsetHistory[]]
  expect(knocked.changes).toHaveLength(1)
  const { seenIn, atMs, interval, sizeDeg, fromDeg, toDeg } = knocked.changes[0]!
  expect(seenIn).toBe('power')
  expect(Math.abs(atMs - STEP_MS)).toBeLessThan(2 * DAY_MS)
  expect(interval[0]).toBeLessThanOrEqual(STEP_MS)
  expect(interval[1]).toBeGreaterThanOrEqual(STEP_MS)
  expect(Math.abs(sizeDeg - 7)).toBeLessThan(1.5)
  expect(Math.abs(fromDeg + 1)).toBeLessThan(1)
  expect(Math.abs(toDeg - 6)).toBeLessThan(1)
  for (const other of others) expect(other.changes).toEqual([])
})

test('vane and position sensor may both have moved: power tells the vane’s part', () => {
  const made = { offsetDeg: stepAt(STEP_DAY, -2, 6), northDeg: stepAt(STEP_DAY, 0, 16) }
  const { changes, positionSteps } = histories(madeFarm(DAYS, [made, ...STEADY]))[0]!
  expect(changes.map(({ seenIn }) => seenIn)).toEqual(['both'])
  expect(Math.abs(changes[0]!.sizeDeg - 8)).toBeLessThan(1.5)
  expect(positionSteps).toHaveLength(1)
  expect(Math.abs(positionSteps[0]!.sizeDeg - 16)).toBeLessThan(1.5)
})

test('a step that power can neither confirm nor deny is said to be seen in the heading', () => {
  const made = { offsetDeg: stepAt(STEP_DAY, 0, 3), noise: 0.2 }
  const { changes, positionSteps } = histories(madeFarm(DAYS, [made, ...STEADY], 2))[0]!
  expect(changes.map(({ seenIn }) => seenIn)).toEqual(['heading'])
  expect(positionSteps).toEqual([])
  const [low, high] = changes[0]!.sizeInterval95Deg
  expect(low).toBeLessThan(0)
  expect(high).toBeGreaterThan(3)
})

test('an event splits the time, whether anything changed or not', () => {
  const at = FIRST_MS + 12 * DAY_MS
  const { changes, segments } = histories(madeFarm(DAYS, [{ offsetDeg: () => 2 }, ...STEADY]), [at])[0]!
  expect(changes.map(({ seenIn, interval }) => [seenIn, interval])).toEqual([['event', [at, at]]])
  const [low, high] = changes[0]!.sizeInterval95Deg
  expect(low).toBeLessThan(0)
  expect(high).toBeGreaterThan(0)
  expect(segments.map(({ estimate }) => estimate)).toEqual([0, 1])
  for (const { offsetDeg, rows } of segments) {
    expect(Math.abs(offsetDeg - 2)).toBeLessThan(0.8)
    expect(rows).toBeGreaterThan(500)
  }
})

test('a step of the heading on the day of an event is one change', () => {
  const frame = madeFarm(DAYS, [{ offsetDeg: stepAt(STEP_DAY, -1, 6) }, ...STEADY])
  const { changes } = histories(frame, [STEP_MS + DAY_MS / 4, FIRST_MS - DAY_MS])[0]!
  expect(changes.map(({ seenIn }) => seenIn)).toEqual(['both'])
})

test('a vane that stands still tells no offset and no change', () => {
  const frame = madeFarm(DAYS, [{ vaneSdDeg: 0 }, ...STEADY])
  expect(histories(frame)[0]).toEqual({ changes: [], segments: [], positionSteps: [] })
})

test('two turbines alone cannot say whose heading stepped', () => {
  expect(headingSteps(madeFarm(8, [{}, { northDeg: stepAt(4, 0, 30) }]))).toEqual([null, null])
})

test('noise is measured between changes, at the block length where it is largest', () => {
  const draw = normals(2)
  const ones = new Float64Array(3000).fill(1)
  const white = ones.map((_, i) => 2 * draw() + 9 * Math.floor(i / 500))
  // Variance of a median deviation: 1.2 % of 3000 overlapping differences, a few times more for blocks of 4.
  expect(Math.abs(Math.sqrt(blockNoise(ones, white, [1, 2, 4])) / 2 - 1)).toBeLessThan(0.12)
  // Values that come in fours count as their mean would: SD 2 for four, 4 for one.
  let level = 0
  const slow = ones.map((_, i) => (i % 4 === 0 ? (level = 2 * draw()) : level))
  expect(blockNoise(ones, slow, [1, 2, 4])).toBeGreaterThan(8)
  // A point that counts four times has a quarter of the variance.
  const fours = ones.map(() => 4)
  const sums = ones.map(() => 4 * draw())
  expect(Math.abs(Math.sqrt(blockNoise(fours, sums, [1])) / 2 - 1)).toBeLessThan(0.08)
  expect(blockNoise(new Float64Array(20), new Float64Array(20), [1])).toBeNaN()
})
