import { expect, test } from 'vitest'
import { annualEnergy, rayleighCumulative } from '../../../src/kernel/wind/index.ts'

// P = 2000 (v^3 - 27) / (1728 - 27) kW from 3 to 12 m/s, then 2000 kW to 25; bins of 0.5 m/s from 3 to 25.
const speeds = Array.from({ length: 45 }, (_, i) => 3 + 0.5 * i)
const powers = speeds.map((v) => (v < 12 ? (2000 * (v ** 3 - 27)) / (1728 - 27) : 2000))
const to16 = speeds.filter((v) => v <= 16).length
const rayleigh = (mean: number) => (v: number) => rayleighCumulative(v, mean)

// Reference run (numpy) of the same sum; no published worked table was reachable.
const AEP_MWH: [number, number][] = [
  [4, 1050.2637572389879],
  [5, 2164.415720920675],
  [6, 3593.9762423983275],
  [7, 5137.872422602826],
  [7.5, 5897.006473203088],
  [8, 6626.292485625159],
  [9, 7952.532122632008],
  [10, 9055.837136449238],
  [11, 9907.989756129986],
]
const MEASURED_SHARE_TO_16: [number, number][] = [
  [4, 0.9999418258158205],
  [5, 0.9973975287203092],
  [6, 0.9817079501144891],
  [7, 0.9438261681290081],
  [8, 0.8869757228513582],
  [9, 0.8210635405265554],
  [10, 0.7552187426759812],
  [11, 0.6949420051936229],
]

test('the sum over bins gives the reference energies', () => {
  for (const [mean, expected] of AEP_MWH) {
    const energy = annualEnergy(speeds, powers, rayleigh(mean))
    expect(Math.abs(energy.measuredMwh / expected - 1), `mean ${mean}`).toBeLessThan(1e-6)
    expect(energy.extrapolatedMwh).toBe(energy.measuredMwh)
    expect(energy.complete).toBe(true)
    expect(energy.bins).toBe(45)
  }
})

test('the sum is close to the integral of power over the distribution', () => {
  // A second way: 8760 h times the integral of P f on a fine grid; the bins' trapezoids differ by less than 1 %.
  const mean = 7.5
  let sum = 0
  for (let v = 3.005; v < 25; v += 0.01) {
    const power = v < 12 ? (2000 * (v ** 3 - 27)) / (1728 - 27) : 2000
    sum += power * (rayleighCumulative(v + 0.005, mean) - rayleighCumulative(v - 0.005, mean))
  }
  expect(annualEnergy(speeds, powers, rayleigh(mean)).measuredMwh / (8.76 * sum)).toBeCloseTo(1, 2)
})

test('data that end early are extrapolated at constant power and flagged below 95 percent', () => {
  for (const [mean, expected] of MEASURED_SHARE_TO_16) {
    const energy = annualEnergy(speeds.slice(0, to16), powers.slice(0, to16), rayleigh(mean), {
      cutOutMs: 25,
    })
    expect(Math.abs(energy.measuredShare / expected - 1), `mean ${mean}`).toBeLessThan(1e-6)
    const full = AEP_MWH.find(([m]) => m === mean)![1]
    expect(Math.abs(energy.extrapolatedMwh / full - 1)).toBeLessThan(1e-6)
    expect(energy.complete).toBe(mean <= 6)
  }
})

test('without a cut-out speed nothing is extrapolated', () => {
  const energy = annualEnergy(speeds.slice(0, to16), powers.slice(0, to16), rayleigh(8))
  expect(energy.measuredShare).toBe(1)
})

test('a bin without power is bridged by its neighbours', () => {
  const straight = speeds.map((v) => 100 * v)
  const holed = straight.map((p, i) => (i === 10 ? NaN : p))
  const whole = annualEnergy(speeds, straight, rayleigh(7))
  const bridged = annualEnergy(speeds, holed, rayleigh(7))
  expect(bridged.bins).toBe(44)
  expect(Math.abs(bridged.measuredMwh / whole.measuredMwh - 1)).toBeLessThan(1e-3)
})

test('no bin gives NaN and is not complete', () => {
  expect(annualEnergy([], [], rayleigh(7))).toEqual({
    measuredMwh: NaN,
    extrapolatedMwh: NaN,
    measuredShare: NaN,
    complete: false,
    bins: 0,
  })
  expect(annualEnergy([5], [NaN], rayleigh(7)).complete).toBe(false)
  expect(annualEnergy([5, 6], [0, 0], rayleigh(7)).measuredShare).toBeNaN()
})

test('arguments that do not fit are refused', () => {
  expect(() => annualEnergy([5], [], rayleigh(7))).toThrow(
    expect.objectContaining({ code: 'LENGTH_MISMATCH' }),
  )
  const outOfRange: unknown = expect.objectContaining({ code: 'OUT_OF_RANGE' })
  expect(() => annualEnergy([5, 5], [1, 1], rayleigh(7))).toThrow(outOfRange)
  expect(() => annualEnergy([5], [1], rayleigh(7), { binWidthMs: 0 })).toThrow(outOfRange)
})
