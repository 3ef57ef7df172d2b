import { expect, test } from 'vitest'
import { score, vaneStatistics, yawError } from '../../src/analysis/index.ts'
import type { TurbineColumns, TurbineFrame } from '../../src/frame/index.ts'
import { frameOf, RAD, syntheticColumns } from './synthetic.ts'

const circularGap = (a: number, b: number): number => Math.abs(a - b - 360 * Math.round((a - b) / 360))

function withNumbers(columns: TurbineColumns, numbers: Record<string, Float64Array>): TurbineColumns {
  return { ...columns, numbers: { ...columns.numbers, ...numbers } }
}

/** Running rows with gaps in every channel, stops, and a nacelle that turns. */
function unevenFrame(): TurbineFrame {
  const columns = syntheticColumns({ days: 8, meanVaneDeg: 1.5, noise: 0.05 })
  const holes = (values: Float64Array, every: number) =>
    values.map((value, i) => (i % every === 3 ? NaN : value))
  const { wind_speed, vane, power } = columns.numbers as Record<'wind_speed' | 'vane' | 'power', Float64Array>
  return frameOf(
    withNumbers(columns, {
      wind_speed: holes(wind_speed, 31),
      vane: holes(vane, 17),
      power: holes(power, 23).map((kw, i) => (i % 50 < 4 ? 0 : kw)),
      nacelle_position: holes(
        vane.map((_, i) => (i * 0.7) % 360),
        19,
      ),
    }),
  ).frame
}

const runs = (frame: TurbineFrame): number[] =>
  [...frame.time.keys()].filter((i) => frame.running[i] === 1 && frame.power[i]! < 0.97 * frame.ratedPowerKw)

test('histogram and groups count every running row below rated once', () => {
  const frame = unevenFrame()
  const expected = runs(frame).length
  expect(expected).toBeGreaterThan(500)
  const answer = yawError(frame, 2)
  const sum = (list: readonly { rows: number }[]) => list.reduce((total, { rows }) => total + rows, 0)
  expect(answer.rows).toBe(expected)
  expect(answer.histogram.counts.reduce((total, count) => total + count, 0)).toBe(expected)
  expect(sum(answer.byWindSpeed)).toBe(expected)
  // Rows without a nacelle position have no direction, and stand in no sector.
  expect(sum(answer.byDirection)).toBe(
    runs(frame).filter((i) => !Number.isNaN(frame.indicatedDirection[i]!)).length,
  )
  expect(vaneStatistics(frame).rows).toBe(expected)
})

test('no number of the answer is lost in missing cells', () => {
  const {
    meanDeg,
    medianDeg,
    circularSdDeg,
    resultantLength,
    kappa,
    skewness,
    kurtosis,
    quantilesDeg,
    meanInterval95Deg,
  } = yawError(unevenFrame(), 2)
  for (const value of [
    meanDeg,
    medianDeg,
    circularSdDeg,
    resultantLength,
    kappa,
    skewness,
    kurtosis,
    ...Object.values(quantilesDeg),
    ...meanInterval95Deg,
  ]) {
    expect(value).toSatisfy(Number.isFinite)
  }
  expect(meanInterval95Deg[0]).toBeLessThan(meanDeg!)
  expect(meanInterval95Deg[1]).toBeGreaterThan(meanDeg!)
})

test('the yaw error is the vane plus the offset, wrapped', () => {
  const frame = unevenFrame()
  const vane = vaneStatistics(frame)
  for (const d of [0, 2, -7.5, 178]) {
    const answer = yawError(frame, d)
    expect(circularGap(answer.meanDeg!, vane.meanDeg! + d)).toBeLessThan(1e-9)
    expect(circularGap(answer.medianDeg!, vane.medianDeg! + d)).toBeLessThan(1e-9)
    expect(answer.circularSdDeg).toBeCloseTo(vane.circularSdDeg!, 9)
    expect(answer.meanDeg).toBeGreaterThanOrEqual(-180)
    expect(answer.meanDeg).toBeLessThan(180)
    expect(answer.offsetUsedDeg).toBe(d)
  }
})

test('without an offset the vane is shown as it is, and the note says so', () => {
  const frame = unevenFrame()
  const answer = yawError(frame, null)
  expect(answer.offsetUsedDeg).toBeNull()
  expect(answer.note).toContain('not known')
  expect(answer.meanDeg).toBe(yawError(frame, 0).meanDeg)
})

test('a bin of the histogram holds the angles from its lower edge to below its upper', () => {
  const columns = syntheticColumns({ days: 1 })
  const angles = [-2, -1.5, -1, 0, 0.999, 1, 3.2]
  const vane = columns.time.map((_, i) => angles[i % angles.length]!)
  const { histogram } = yawError(frameOf(withNumbers(columns, { vane })).frame, 0)
  const each = (k: number) => Math.floor(144 / 7) + (k < 144 % 7 ? 1 : 0)
  expect(histogram.firstEdgeDeg).toBe(-2)
  expect(histogram.binWidthDeg).toBe(1)
  expect(histogram.counts).toEqual([each(0) + each(1), each(2), each(3) + each(4), each(5), 0, each(6)])
})

test('angles far off are kept, not cut', () => {
  const columns = syntheticColumns({ days: 6 })
  const vane = columns.numbers['vane']!.map((value, i) => (i % 10 === 0 ? 120 : value))
  const answer = yawError(frameOf(withNumbers(columns, { vane })).frame, 0)
  expect(answer.rows).toBe(6 * 144)
  expect(answer.histogram.counts.at(-1)).toBe(Math.ceil((6 * 144) / 10))
  expect(answer.histogram.firstEdgeDeg + answer.histogram.counts.length).toBe(121)
})

test('a turbine that never runs has no distribution and throws nothing', () => {
  const columns = syntheticColumns({ days: 6 })
  const frame = frameOf(withNumbers(columns, { power: new Float64Array(6 * 144) })).frame
  const answer = yawError(frame, 1)
  expect(answer.rows).toBe(0)
  expect(answer.meanDeg).toBeNaN()
  expect(answer.histogram.counts).toEqual([])
  expect(answer.byWindSpeed).toEqual([])
  expect(vaneStatistics(frame)).toMatchObject({ rows: 0 })
  expect(score(frame, 1).score).toBeNaN()
})

test('rows at rated power are left out', () => {
  const columns = syntheticColumns({ days: 6 })
  const { frame } = frameOf(columns)
  const capped = { ...frame, ratedPowerKw: 1000 }
  expect(yawError(capped, 0).rows).toBe(frame.power.filter((kw) => kw < 970).length)
})

test('the score is 100 times the mean of cos^3, weighted by the energy on offer', () => {
  const columns = syntheticColumns({ days: 20 })
  const wind = columns.numbers['wind_speed']!
  const facing = (vane: Float64Array) =>
    frameOf(withNumbers(columns, { vane, power: wind.map((u) => 2 * u ** 3) })).frame
  const still = facing(wind.map(() => 0))
  expect(score(still, 0).score).toBeCloseTo(100, 9)
  expect(score(still, 10).score).toBeCloseTo(100 - 4.4887834294734414, 9) // 1 - cos(10)^3, numpy
  expect(score(still, -10).score).toBeCloseTo(100 - 4.4887834294734414, 9)
  // Off by 20 degrees in strong wind only: what strong wind offers counts with its power.
  const uneven = facing(wind.map((u) => (u > 9 ? 20 : 0)))
  const offered = (from: number) => wind.reduce((sum, u) => sum + (u > from ? u ** 3 : 0), 0)
  const lost = (offered(9) / offered(0)) * (1 - Math.cos(20 * RAD) ** 3)
  expect(Math.abs(score(uneven, 0).score - 100 * (1 - lost))).toBeLessThan(0.05) // curve of bins: 0.3 % of the weight
})

test('the spread inside an interval is an upper bound of 3/2 of its mean square, in per cent', () => {
  const columns = syntheticColumns({ days: 6 })
  const with6 = frameOf(withNumbers(columns, { vane_sd: new Float64Array(6 * 144).fill(6) })).frame
  expect(score(with6, 0).withinInterval).toBeCloseTo(150 * (6 * RAD) ** 2, 9)
  expect(score(frameOf(columns).frame, 0).withinInterval).toBeNaN()
})
