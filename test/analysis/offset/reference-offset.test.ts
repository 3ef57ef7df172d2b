import { expect, test } from 'vitest'
import { dayBlocks } from '../../../src/analysis/index.ts'
import { referenceOffset, type ReferenceOffset } from '../../../src/analysis/offset/reference-offset.ts'
import type { TurbineColumns } from '../../../src/frame/index.ts'
import type { SiteFile, TurbineSetup } from '../../../src/sheet/index.ts'
import { SETTINGS } from '../../frame/settings.ts'
import { normals } from '../../kernel/stats/normals.ts'
import { frameOf, syntheticColumns } from '../synthetic.ts'

/** Instrument part at 95 %, by hand: 1.959964 times 0.5 degrees. */
const INSTRUMENT = 0.979982

function answerFor(
  channels: (columns: TurbineColumns) => Record<string, Float64Array>,
  setup: Partial<TurbineSetup> = {},
  days = 10,
): ReferenceOffset | null {
  const columns = syntheticColumns({ days, meanVaneDeg: 1 })
  const site: SiteFile = { turbines: [{ turbine: 'T1', ratedPowerKw: 5000, ...setup }] }
  const made = frameOf({ ...columns, numbers: { ...columns.numbers, ...channels(columns) } }, SETTINGS, site)
  return referenceOffset(made.frame, dayBlocks(made.days, { resamples: 400, seed: 1 }))
}

/** A nacelle that wanders, and the true direction over it when the rotor stands vane + 4 off. */
function mast({ time, numbers }: TurbineColumns): Record<string, Float64Array> {
  const position = time.map((_, i) => (300 + i / 5) % 360)
  return {
    nacelle_position: position,
    reference_direction: position.map((heading, i) => (heading + numbers['vane']![i]! + 4 + 360) % 360),
  }
}

test('a reference that reads the yaw error tells d and m, with the doubt about its own zero', () => {
  const answer = answerFor(({ numbers }) => ({
    reference_yaw_error: numbers['vane']!.map((vane) => vane + 4),
  }))!
  expect(answer.failure).toBe(null)
  expect(answer.kind).toBe('yawError')
  expect(answer.offsetDeg).toBeCloseTo(4, 9)
  // The vane's mean is 1 but for what 1440 draws with an SD of 4 leave.
  expect(Math.abs(answer.standingDeg - 5)).toBeLessThan((4 * 4) / Math.sqrt(1440))
  expect(answer.statistical).toBeLessThan(1e-9)
  expect(answer.instrument).toBeCloseTo(INSTRUMENT, 5)
  expect(answer.halfWidthDeg).toBeCloseTo(INSTRUMENT, 5)
})

test('days that differ widen the interval, rows of one day do not narrow it', () => {
  const draw = normals(7)
  const level = Array.from({ length: 20 }, () => 2 * draw())
  const answer = answerFor(
    ({ numbers }) => ({
      reference_yaw_error: numbers['vane']!.map((vane, i) => vane + 4 + level[Math.floor(i / 144)]!),
    }),
    {},
    20,
  )!
  // Standard error of the mean of 20 days with an SD near 2: 0.45; t quantile 2.09; blocks of 4 days vary it by some tens of percent.
  expect(answer.statistical).toBeGreaterThan(0.6)
  expect(answer.statistical).toBeLessThan(1.7)
  expect(answer.halfWidthDeg).toBeCloseTo(Math.hypot(answer.statistical, answer.instrument), 9)
})

test('the mounting of the site file takes the place of the usual one', () => {
  const answer = answerFor(
    ({ numbers }) => ({ reference_yaw_error: numbers['vane']!.map((vane) => vane - 2) }),
    { reference: { kind: 'yawError', mountingDeg: 0.2 } },
  )!
  expect(answer.offsetDeg).toBeCloseTo(-2, 9)
  expect(answer.instrument).toBeCloseTo(0.4 * INSTRUMENT, 5)
})

test('a direction near 0 while the turbine runs is taken as relative to the nacelle, and that is said', () => {
  const answer = answerFor(({ numbers }) => ({
    reference_direction: numbers['vane']!.map((vane) => (vane + 4 + 360) % 360),
  }))!
  expect(answer.kind).toBe('relativeDirection')
  expect(answer.kindText).toMatch(/relative to the nacelle/)
  expect(answer.offsetDeg).toBeCloseTo(4, 9)
})

test('a direction from north needs a nacelle whose north was surveyed', () => {
  const refused = answerFor(mast)!
  expect(refused.kind).toBe('absoluteDirection')
  expect(refused.failure?.code).toBe('reference-north-unknown')
  expect(refused.offsetDeg).toBe(NaN)
  const surveyed = answerFor(mast, { nacelle: { northOffsetSource: 'surveyed' } })!
  expect(surveyed.failure).toBe(null)
  expect(surveyed.offsetDeg).toBeCloseTo(4, 9)
})

test('an offset that changes with wind speed shows in the bins', () => {
  const answer = answerFor(({ numbers }) => ({
    reference_yaw_error: numbers['vane']!.map((vane, i) => vane + Math.floor(numbers['wind_speed']![i]!)),
  }))!
  expect(answer.byWindSpeed.length).toBeGreaterThan(4)
  for (const bin of answer.byWindSpeed) expect(bin.offsetDeg).toBeCloseTo(bin.fromMs, 9)
  const rows = answer.byWindSpeed.reduce((sum, bin) => sum + bin.rows, 0)
  expect(rows).toBe(answer.rows)
})

test('a reference that points astray for a while is left out and counted', () => {
  const answer = answerFor(({ numbers }) => ({
    reference_yaw_error: numbers['vane']!.map((vane, i) => (i < 100 ? 120 : vane + 4)),
  }))!
  expect(answer.strayRows).toBe(100)
  expect(answer.offsetDeg).toBeCloseTo(4, 9)
})

test('no reference gives null; one that is not what the site file states, or too short, is refused in words', () => {
  expect(answerFor(() => ({}))).toBe(null)
  const other = answerFor(
    ({ numbers }) => ({ reference_yaw_error: numbers['vane']!.map((vane) => vane + 4) }),
    { reference: { kind: 'relativeDirection' } },
  )!
  expect(other.failure?.text).toMatch(/no reference_direction/)
  const short = answerFor(({ numbers }) => ({
    reference_yaw_error: numbers['vane']!.map((vane, i) => (i < 144 ? vane + 4 : NaN)),
  }))!
  expect(short.failure?.code).toBe('reference-too-few-rows')
})
