import { expect, test } from 'vitest'
import { energyLoss, powerCurveTable } from '../../../src/analysis/index.ts'
import type { TurbineColumns, TurbineFrame } from '../../../src/frame/index.ts'
import { frameOf, RAD, syntheticColumns } from '../synthetic.ts'

/** Rows at wind speeds of 4.5 to 11.5 m/s and one and the same vane; the measured curve is 2 u^3 kW. */
function steadyFrame(vaneDeg = 0): TurbineFrame {
  const columns = syntheticColumns({ days: 20 })
  const wind = columns.numbers['wind_speed']!
  return frameOf({
    ...columns,
    numbers: { wind_speed: wind, vane: wind.map(() => vaneDeg), power: wind.map((u) => 2 * u ** 3) },
  }).frame
}

const offset = (standingDeg: number, half = 1) => ({
  offsetDeg: standingDeg,
  standingDeg,
  standingInterval95Deg: [standingDeg - half, standingDeg + half] as const,
})
const NONE: [] = []
const lossOf = (frame: TurbineFrame, standingDeg: number, exponent = 3, half = 1) =>
  energyLoss(frame, { exponent, offset: offset(standingDeg, half), byExponent: NONE })

/** The measured curve runs straight or cubic between its points: its local slope is right to 2 %. */
const CURVE = 0.02

test('on u^3 and a steady vane the share lost is 1 - cos^p', () => {
  const frame = steadyFrame()
  for (const [deg, exponent, percent] of [
    [5, 3, 1.1372519858923735], // 1 - cos(5)^3, numpy
    [-5, 3, 1.1372519858923735],
    [10, 3, 4.4887834294734414],
    [7.5, 2, 1.7037086855465844], // sin(7.5)^2
    [8, 1.4, 1.3598133007671098],
  ] as const) {
    const { static: loss, producedMwh, dynamic } = lossOf(frame, deg, exponent)
    // What was produced is cos^p of what would have been: the loss over both together.
    const share = (100 * loss.windowMwh!) / (producedMwh! + loss.windowMwh!)
    expect(Math.abs(share / percent - 1), `${deg} degrees, p ${exponent}`).toBeLessThan(CURVE)
    expect(loss.recoverablePctOfProduced).toBeCloseTo((100 * loss.windowMwh!) / producedMwh!, 12)
    expect(Math.abs(dynamic.windowMwh!)).toBeLessThan(1e-9) // nothing is left to gain once the steady vane is corrected
  }
})

test('the produced energy is that of the running rows', () => {
  const frame = steadyFrame()
  const { producedMwh, hours, windowHours, gapHours, gapsScaledBy, rows } = lossOf(frame, 5)
  expect(producedMwh).toBeCloseTo(frame.power.reduce((sum, kw) => sum + kw, 0) / 6 / 1000, 9)
  expect(hours).toBeCloseTo(480, 9)
  expect(windowHours).toBeCloseTo(480, 9)
  expect(gapHours).toBe(0)
  expect(gapsScaledBy).toBe(1)
  expect(rows).toBe(20 * 144)
})

test('where a mean vane is held, the misalignment counts and not the vane', () => {
  const centred = lossOf(steadyFrame(0), 5).static.windowMwh!
  for (const vaneDeg of [4, -9, 175, -180]) {
    const turned = energyLoss(steadyFrame(vaneDeg), {
      exponent: 3,
      offset: { offsetDeg: 5 - vaneDeg, standingDeg: 5, standingInterval95Deg: [4, 6] },
      byExponent: NONE,
    })
    expect(Math.abs(turned.static.windowMwh! - centred), `vane ${vaneDeg}`).toBeLessThan(1e-9)
  }
})

test('nothing stands off, nothing is gained', () => {
  const { static: loss } = lossOf(steadyFrame(), 0)
  expect(loss.windowMwh).toBe(0)
  expect(loss.annualMwh).toBe(0)
  expect(loss.recoverablePctOfProduced).toBe(0)
})

test('the interval of the loss is that of the misalignment, from 0 where that spans 0', () => {
  const frame = steadyFrame()
  const { static: clear } = lossOf(frame, 5, 3, 2)
  expect(clear.windowInterval95Mwh[0]).toBeCloseTo(lossOf(frame, 3).static.windowMwh!, 9)
  expect(clear.windowInterval95Mwh[1]).toBeCloseTo(lossOf(frame, 7).static.windowMwh!, 9)
  const { static: negative } = lossOf(frame, -5, 3, 2)
  expect(negative.windowInterval95Mwh[0]).toBeCloseTo(clear.windowInterval95Mwh[0]!, 9)
  const { static: open } = lossOf(frame, 2, 3, 4)
  expect(open.windowInterval95Mwh[0]).toBe(0)
  expect(open.windowInterval95Mwh[1]).toBeCloseTo(lossOf(frame, 6).static.windowMwh!, 9)
  expect(open.annualInterval95Mwh[0]).toBe(0)
  expect(clear.annualInterval95Mwh[0]).toBeLessThan(clear.annualMwh!)
  expect(clear.annualInterval95Mwh[1]).toBeGreaterThan(clear.annualMwh!)
})

test('the same rows at a smaller exponent mean a larger offset and a larger loss', () => {
  const frame = steadyFrame()
  const { band } = energyLoss(frame, {
    exponent: 3,
    offset: offset(5),
    byExponent: [
      { exponent: 3, offsetDeg: 5, standingDeg: 5 },
      { exponent: 2, offsetDeg: 7.5, standingDeg: 7.5 },
    ],
  })
  const [at3, at2] = band.map(({ staticAnnualMwh }) => staticAnnualMwh!)
  // 1.1 % against 1.7 %: 1 - cos(5)^3 and 1 - cos(7.5)^2, as above.
  const gain = (percent: number) => percent / (100 - percent)
  expect(Math.abs(at2! / at3! / (gain(1.7037) / gain(1.13725)) - 1)).toBeLessThan(CURVE)
  expect(band[1]).toMatchObject({ exponent: 2, offsetDeg: 7.5, standingDeg: 7.5 })
})

test('a gain ends at rated power', () => {
  const frame = steadyFrame()
  const free = lossOf(frame, 5).static.windowMwh!
  // Rated below everything the rows show: nothing to gain.
  expect(lossOf({ ...frame, ratedPowerKw: 100 }, 5).static.windowMwh).toBe(0)
  // Rated in the middle of the rows: rows above gain nothing, rows well below gain as before.
  const capped = lossOf({ ...frame, ratedPowerKw: 1024 }, 5).static.windowMwh! // 2 x 8^3
  expect(capped).toBeGreaterThan(0)
  let below = 0
  frame.windSpeed.forEach((u) => {
    const now = Math.min(1024, 2 * u ** 3)
    below += Math.min(1024, (2 * u ** 3) / Math.cos(5 * RAD) ** 3) - now
  })
  expect(Math.abs(capped / (below / 6 / 1000) - 1)).toBeLessThan(CURVE)
  expect(capped).toBeLessThan(free)
})

test('rows that are held back or do not run gain nothing', () => {
  const frame = steadyFrame()
  const half = Uint8Array.from(frame.limited, (_, i) => i % 2)
  const all = lossOf(frame, 5).static.windowMwh!
  const odd = lossOf({ ...frame, limited: half }, 5)
  const even = lossOf({ ...frame, limited: half.map((flag) => 1 - flag) }, 5)
  expect(odd.static.windowMwh! + even.static.windowMwh!).toBeCloseTo(all, 9)
  expect(odd.producedMwh).toBe(lossOf(frame, 5).producedMwh) // they produced nevertheless
  expect(odd.rows).toBe(frame.time.length / 2)
  const stopped = lossOf({ ...frame, running: frame.running.map(() => 0) }, 5)
  expect(stopped).toMatchObject({ producedMwh: 0, rows: 0 })
  expect(stopped.static.windowMwh).toBe(0)
})

test('the spread of the yaw error costs 1 - mean of cos^3, apart from what a correction gains', () => {
  const columns = syntheticColumns({ days: 20 })
  const wind = columns.numbers['wind_speed']!
  const swing = wind.map((_, i) => (i % 2 === 0 ? 8 : -8))
  const { frame } = frameOf({
    ...columns,
    numbers: { wind_speed: wind, vane: swing, power: wind.map((u) => 2 * u ** 3) },
  })
  const { static: fixed, dynamic, producedMwh } = lossOf(frame, 0)
  expect(fixed.windowMwh).toBe(0)
  const expected = (1 / Math.cos(8 * RAD) ** 3 - 1) * producedMwh!
  expect(Math.abs(dynamic.windowMwh! / expected - 1)).toBeLessThan(CURVE)
})

test('without an offset there is energy and no loss', () => {
  const answer = energyLoss(steadyFrame(), { exponent: 3, offset: null, byExponent: NONE })
  expect(answer.producedMwh).toBeGreaterThan(0)
  expect(answer.static.windowMwh).toBeNull()
  expect(answer.static.annualInterval95Mwh).toEqual([null, null])
  expect(answer.dynamic.annualMwh).toBeNull()
  expect(answer.band).toEqual([])
})

test('hours without rows are not hours covered', () => {
  const columns = syntheticColumns({ days: 20 })
  const kept = (_: number, i: number): boolean => i < 10 * 144 || i >= 15 * 144
  const gappy: TurbineColumns = {
    ...columns,
    time: columns.time.filter(kept),
    numbers: Object.fromEntries(
      Object.entries(columns.numbers).map(([key, values]) => [key, values.filter(kept)]),
    ),
  }
  const { hours, windowHours, gapHours, gapsScaledBy, static: loss } = lossOf(frameOf(gappy).frame, 5)
  expect(hours).toBeCloseTo(360, 9)
  expect(windowHours).toBeCloseTo(480, 9)
  expect(gapHours).toBeCloseTo(120, 9)
  expect(gapsScaledBy).toBeCloseTo(480 / 360, 9)
  // The gap loses at the rate of the rest; 15 of the 20 days are alike to the whole within their weather.
  const whole = lossOf(frameOf(columns).frame, 5).static.windowMwh!
  expect(Math.abs(loss.windowMwh! / whole - 1)).toBeLessThan(0.1)
})

test('a row without a vane is a gap while the turbine produces, and none while it stands', () => {
  const columns = syntheticColumns({ days: 20 })
  const holes = (of: Float64Array, power: number) => ({
    ...columns,
    numbers: {
      ...columns.numbers,
      vane: of.map((value, i) => (i % 4 === 0 ? NaN : value)),
      power: columns.numbers['power']!.map((kw, i) => (i % 4 === 0 ? power * kw : kw)),
    },
  })
  const vane = columns.numbers['vane']!
  expect(lossOf(frameOf(holes(vane, 1)).frame, 5).gapHours).toBeCloseTo(120, 9)
  expect(lossOf(frameOf(holes(vane, -0.01)).frame, 5).gapHours).toBe(0)
})

test('the table of the curve is the curve: u^3 and its steepness 3', () => {
  const table = powerCurveTable(steadyFrame())
  expect(table.length).toBe(15) // centres 4.5 to 11.5
  for (const { windSpeedMs, powerKw, steepness, rows } of table) {
    expect(Math.abs(powerKw / (2 * windSpeedMs ** 3) - 1), `${windSpeedMs} m/s`).toBeLessThan(0.005)
    expect(Math.abs(steepness! - 3), `${windSpeedMs} m/s`).toBeLessThan(0.05)
    expect(rows).toBeGreaterThanOrEqual(3)
  }
})
