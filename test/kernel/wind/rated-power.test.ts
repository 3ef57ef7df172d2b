import { expect, test } from 'vitest'
import { kneeSpeed, measuredPowerCurve, ratedPowerFrom } from '../../../src/kernel/wind/index.ts'

/** Speeds at the even quantiles of a Rayleigh distribution: a month without luck. */
function rayleighSpeeds(mean: number, rows = 4320): number[] {
  return Array.from(
    { length: rows },
    (_, i) => mean * Math.sqrt((-4 / Math.PI) * Math.log(1 - (i + 0.5) / rows)),
  )
}

/** Normal quantiles in a fixed, scattered order, so that neighbours in speed get different noise. */
function scatter(i: number): number {
  const a = ((i * 7919) % 1009) / 1009 + 0.5 / 1009
  const b = ((i * 104_729) % 997) / 997
  return Math.sqrt(-2 * Math.log(a)) * Math.cos(2 * Math.PI * b)
}

const power = (u: number) => Math.min(2000, (2000 * u ** 3) / 12 ** 3)

test('the plateau of a windy month is rated power', () => {
  const rows = rayleighSpeeds(8.5).map(power)
  expect(ratedPowerFrom(rows)).toBeCloseTo(2000, 9)
})

test('noise on the plateau hardly moves it', () => {
  for (const noise of [0.005, 0.01, 0.03, 0.05, 0.08, 0.1]) {
    const rows = rayleighSpeeds(8.5).map((u, i) => power(u) * (1 + noise * scatter(i)))
    expect(Math.abs(ratedPowerFrom(rows) / 2000 - 1), `noise ${noise}`).toBeLessThan(
      noise > 0.05 ? 0.025 : 0.01,
    )
  }
})

test('spikes, stopped rows and missing rows do not move it', () => {
  const rows = rayleighSpeeds(8.5).map((u, i) => power(u) * (1 + 0.01 * scatter(i)))
  const plain = ratedPowerFrom(rows)
  const spoilt = [...rows, ...Array<number>(500).fill(0), ...Array<number>(500).fill(-8)]
  for (let i = 0; i < 20; i++) spoilt.push(2600 + 400 * i, NaN, Infinity)
  expect(ratedPowerFrom(spoilt)).toBe(plain)
})

test('a month of little wind shows no plateau', () => {
  expect(ratedPowerFrom(rayleighSpeeds(4.2).map(power))).toBeNaN()
  expect(ratedPowerFrom(rayleighSpeeds(5).map((u, i) => power(u) * (1 + 0.1 * scatter(i))))).toBeNaN()
  expect(ratedPowerFrom([])).toBeNaN()
  expect(ratedPowerFrom([NaN, -1, 0])).toBeNaN()
  expect(ratedPowerFrom([2000, 2000, 2000])).toBeNaN() // three rows are no plateau
})

test('days of derating below the plateau do not hide it', () => {
  const rows = rayleighSpeeds(8.5).map((u, i) => (i % 6 === 0 ? Math.min(power(u), 1200) : power(u)))
  expect(ratedPowerFrom(rows)).toBeCloseTo(2000, 9)
})

test('the knee is where the curve reaches its share of rated power', () => {
  const speeds = rayleighSpeeds(8.5)
  const curve = measuredPowerCurve(speeds, speeds.map(power))
  // 2000 (u / 12)^3 = share x 2000 at 12 share^(1/3).
  expect(Math.abs(kneeSpeed(curve, 2000) - 12 * Math.cbrt(0.9))).toBeLessThan(0.03)
  expect(Math.abs(kneeSpeed(curve, 2000, 0.5) - 12 * Math.cbrt(0.5))).toBeLessThan(0.005)
})

test('a knee outside the curve is not known', () => {
  const speeds = rayleighSpeeds(8.5)
  const curve = measuredPowerCurve(speeds, speeds.map(power))
  expect(kneeSpeed(curve, 3000)).toBeNaN()
  expect(kneeSpeed(curve, NaN)).toBeNaN()
  const high = measuredPowerCurve([15, 15, 15, 16, 16, 16], [2000, 2000, 2000, 2000, 2000, 2000])
  expect(kneeSpeed(high, 2000)).toBeNaN()
  expect(kneeSpeed(measuredPowerCurve([], []), 2000)).toBeNaN()
})
