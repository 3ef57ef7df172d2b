import { expect, test } from 'vitest'
import { energyLoss } from '../../../src/analysis/index.ts'
import type { TurbineFrame } from '../../../src/frame/index.ts'
import type { LongTerm } from '../../../src/sheet/index.ts'
import { frameOf, RAD, syntheticColumns } from '../synthetic.ts'

/** Rows at 4.5 to 11.5 m/s, a vane of 0, power 2 u^3 kW. */
function steadyFrame(days = 20): TurbineFrame {
  const columns = syntheticColumns({ days })
  const wind = columns.numbers['wind_speed']!
  return frameOf({
    ...columns,
    numbers: { wind_speed: wind, vane: wind.map(() => 0), power: wind.map((u) => 2 * u ** 3) },
  }).frame
}

const lossOf = (frame: TurbineFrame, longTerm?: LongTerm) =>
  energyLoss(frame, {
    exponent: 3,
    offset: { offsetDeg: 6, standingDeg: 6, standingInterval95Deg: [4, 8] },
    byExponent: [{ exponent: 3, offsetDeg: 6, standingDeg: 6 }],
    longTerm,
  })

/** The frame with the curve of the worked example: 2000 (v^3 - 27) / 1701 kW from 3 to 12 m/s, then 2000 kW. */
function withExampleCurve(frame: TurbineFrame, lastMs: number): TurbineFrame {
  const speedsMs = Float64Array.from({ length: (lastMs - 3) * 2 + 1 }, (_, i) => 3 + 0.5 * i)
  const fittedKw = speedsMs.map((v) => (v < 12 ? (2000 * (v ** 3 - 27)) / 1701 : 2000))
  const curve = {
    ...frame.curve,
    bins: Int32Array.from(speedsMs, (v) => 2 * v),
    speedsMs,
    fittedKw,
    slopes: speedsMs.map(() => 0),
    counts: speedsMs.map(() => 10),
  }
  return { ...frame, curve, ratedPowerKw: 2000 }
}

test('energies of a year are those of the worked example, and the flag flips between means of 6 and 7 m/s', () => {
  // Reference run (numpy) of the binned sum; no published worked table was reachable.
  const expected = new Map([
    [4, 1050.2637572389879],
    [5, 2164.415720920675],
    [6, 3593.9762423983275],
    [7, 5137.872422602826],
    [8, 6626.292485625159],
    [9, 7952.532122632008],
    [10, 9055.837136449238],
    [11, 9907.989756129986],
  ])
  const frame = steadyFrame()
  const whole = lossOf(withExampleCurve(frame, 25)).yearAhead.byMeanWindSpeed
  for (const [mean, mwh] of expected) {
    const line = whole.find((one) => one.meanWindSpeedMs === mean && one.distribution === 'Rayleigh')!
    expect(Math.abs(line.aepMeasuredMwh! / mwh - 1), `mean ${mean}`).toBeLessThan(1e-6)
    expect(line.complete, `mean ${mean}`).toBe(true)
  }
  const to16 = lossOf(withExampleCurve(frame, 16)).yearAhead.byMeanWindSpeed.filter(
    (one) => one.distribution === 'Rayleigh' && expected.has(one.meanWindSpeedMs),
  )
  expect(to16.map(({ meanWindSpeedMs, complete }) => [meanWindSpeedMs, complete])).toEqual([
    ...[4, 5, 6].map((mean) => [mean, true]),
    ...[7, 8, 9, 10, 11].map((mean) => [mean, false]),
  ])
  for (const line of to16) {
    const mwh = expected.get(line.meanWindSpeedMs)!
    expect(Math.abs(line.aepExtrapolatedMwh! / mwh - 1)).toBeLessThan(1e-3) // wind above 25 m/s alone is left out
  }
})

test('without a long-term reference the year is a range, and its middle a Rayleigh year at the mean of the window', () => {
  const frame = steadyFrame()
  const { yearAhead, static: loss } = lossOf(frame)
  const mean = frame.windSpeed.reduce((sum, u) => sum + u, 0) / frame.windSpeed.length
  expect(yearAhead.basis).toBe('range over mean wind speeds')
  expect(yearAhead.meanWindSpeedMs).toBeCloseTo(mean, 9)
  const own = yearAhead.byMeanWindSpeed.find(
    (one) => one.meanWindSpeedMs === yearAhead.meanWindSpeedMs && one.distribution === 'Rayleigh',
  )!
  expect(own.staticMwh).toBe(loss.annualMwh)
  expect(own.staticInterval95Mwh).toEqual(loss.annualInterval95Mwh)
  const [low, high] = yearAhead.rangeMwh as [number, number]
  expect(low).toBeLessThan(loss.annualMwh!)
  expect(high).toBeGreaterThan(loss.annualMwh!)
  // By hand: 8760 h times the integral of the gain over the distribution, between the first and the last bin.
  const outer = frame.windSpeed.filter((u) => u >= 11.25)
  const last = outer.reduce((sum, u) => sum + u, 0) / outer.length
  let kw = 0
  for (let v = 4.25; v < last; v += 0.01) {
    const share =
      Math.exp(-(Math.PI / 4) * (v / mean) ** 2) - Math.exp(-(Math.PI / 4) * ((v + 0.01) / mean) ** 2)
    kw += share * 2 * (v + 0.005) ** 3 * (1 / Math.cos(6 * RAD) ** 3 - 1)
  }
  // The sum begins half a metre below the mean speed of its first bin, and its trapezoids lie above a cubic.
  expect(Math.abs(loss.annualMwh! / (8.76 * kw) - 1)).toBeLessThan(0.02)
})

test('with the mean of the window as long-term mean the year is the window scaled', () => {
  const frame = steadyFrame()
  const mean = frame.windSpeed.reduce((sum, u) => sum + u, 0) / frame.windSpeed.length
  const { static: loss, yearAhead } = lossOf(frame, { meanWindSpeedMs: mean, source: 'a mast' })
  expect(yearAhead.basis).toBe('long-term reference')
  expect(yearAhead.note).toContain('a mast')
  // Bins of half a metre for a cubic curve: the trapezoids add 1 % at most.
  expect(Math.abs(loss.annualMwh! / ((loss.windowMwh! * 8760) / 480) - 1)).toBeLessThan(0.01)
})

test('a windier long-term mean makes a costlier year; a given shape makes it a Weibull year', () => {
  const frame = steadyFrame()
  const of = (meanWindSpeedMs: number) => lossOf(frame, { meanWindSpeedMs, source: 's' }).static.annualMwh!
  expect(of(7)).toBeLessThan(of(8))
  // Every speed and so every gain of a cubic curve grows: 5 % of wind by 16 %, less where speeds pass the last bin.
  const weibull = lossOf(frame, { meanWindSpeedMs: 7, weibullShape: 2, source: 's' })
  const rayleigh = weibull.yearAhead.byMeanWindSpeed.find(
    (one) => one.meanWindSpeedMs === 7 && one.distribution === 'Rayleigh',
  )!
  expect(Math.abs(weibull.static.annualMwh! / rayleigh.staticMwh! - 1)).toBeLessThan(1e-6)
})

test('rows of a year are counted: few hours, thin bins and a curve that ends below rated are flagged', () => {
  const enough = lossOf(withExampleCurve(steadyFrame(), 25)).curveCheck
  // 85 % of 2000 kW is reached at 11.4 m/s, 1.5 times that is 17.
  expect(enough).toMatchObject({ incompleteBins: [], complete: true, hoursNeeded: 180 })
  expect(lossOf(withExampleCurve(steadyFrame(), 16)).curveCheck).toMatchObject({
    complete: false,
    incompleteBins: [
      { windSpeedMs: 16.5, minutes: 0 },
      { windSpeedMs: 17, minutes: 0 },
    ],
  })
  const short = lossOf(withExampleCurve(steadyFrame(7), 25)).curveCheck
  expect(short.hours).toBeLessThan(180)
  expect(short.complete).toBe(false)
  const belowRated = lossOf(steadyFrame()).curveCheck
  expect(belowRated.complete).toBe(false)
  expect(belowRated.note).toContain('does not reach')
  expect(belowRated.label).toBe('binned in the manner of IEC 61400-12-1; not a power performance test')
})

test('a supplied curve stands beside the measured one and moves no number', () => {
  const frame = steadyFrame()
  const powerCurve = Array.from({ length: 20 }, (_, i) => ({
    windSpeedMs: i + 1,
    powerKw: 2 * (i + 1) ** 3 * 1.1,
  }))
  const supplied = { ...frame, setup: { ...frame.setup, powerCurve } }
  const { suppliedCurve, ...rest } = lossOf(supplied)
  const { suppliedCurve: none, ...bare } = lossOf(frame)
  expect(none).toBeNull()
  expect(rest).toEqual(bare)
  // 1 / 1.1 - 1, and the chords of a cubic over 1 m/s lie above it by up to 2 % at 5 m/s.
  expect(suppliedCurve!.aepDifferencePct!).toBeGreaterThan(-11)
  expect(suppliedCurve!.aepDifferencePct!).toBeLessThan(-9)
  expect(suppliedCurve!.bins.length).toBe(15)
})
