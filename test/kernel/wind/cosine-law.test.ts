import fc from 'fast-check'
import { expect, test } from 'vitest'
import {
  cosineLaw,
  expectedCosinePower,
  expectedCosinePowerVonMises,
  lossShare,
  staticShareGivenDynamic,
} from '../../../src/kernel/wind/index.ts'

const RAD = Math.PI / 180
const outOfRange: unknown = expect.objectContaining({ code: 'OUT_OF_RANGE' })

test('losses are 1 - cos^p to nine digits of a percentage', () => {
  // Reference run (numpy), percent.
  const ANGLES = [2, 3, 4, 5, 6, 8, 10, 12, 15, 20, 30]
  const LOSS: [number, number[]][] = [
    [
      3,
      [
        0.18264058936097172, 0.4105763785285266, 0.7290062121680596, 1.1372519858923735, 1.6344449400006789,
        2.8912584033171873, 4.4887834294734414, 6.4135050855908755, 9.877893498656187, 17.023053441056856,
        35.048094716167085,
      ],
    ],
    [
      2,
      [
        0.12179748700877902, 0.2739052315863466, 0.486596562921493, 0.7596123493895934, 1.0926199633097267,
        1.9369152030840442, 3.0153689607045897, 4.32272711786994, 6.698729810778059, 11.697777844051094, 25,
      ],
    ],
    [
      1.4,
      [
        0.08527382549217144, 0.19181253103781604, 0.3408667347682637, 0.5323365090806553, 0.7660934561516952,
        1.3598133007671098, 2.1204322996471348, 3.0459061780269137, 4.737650318456977, 8.339938770544608,
        18.239623182298658,
      ],
    ],
  ]
  for (const [exponent, losses] of LOSS) {
    for (const [i, angle] of ANGLES.entries()) {
      expect(Math.abs(100 * lossShare(angle, exponent) - losses[i]!)).toBeLessThan(1e-9)
      expect(Math.abs(100 * (1 - cosineLaw(-angle, exponent)) - losses[i]!)).toBeLessThan(1e-9)
    }
  }
})

test('one percent is lost at the angle that acos gives', () => {
  for (const [exponent, angle] of [
    [1.5, 6.625172672714437],
    [2, 5.73917047726678],
    [3, 4.687321841189463],
  ] as const) {
    expect(lossShare(angle, exponent)).toBeCloseTo(0.01, 12)
    expect(angle).toBeCloseTo(Math.acos(Math.pow(0.99, 1 / exponent)) / RAD, 9)
  }
})

test('a tiny yaw error keeps the digits of its loss', () => {
  // 1 - cos^p g = p g^2 / 2 to order g^4.
  expect(lossShare(1e-6, 3) / (1.5 * (1e-6 * RAD) ** 2)).toBeCloseTo(1, 9)
  expect(lossShare(0, 3)).toBeCloseTo(0, 20)
})

test('power is a share and gone from 90 degrees on', () => {
  for (const angle of [90.0001, 120, 180, -135, 270 - 0.0001]) {
    expect(cosineLaw(angle, 3)).toBe(0)
    expect(lossShare(angle, 3)).toBe(1)
  }
  expect(cosineLaw(NaN, 3)).toBeNaN()
  expect(lossShare(NaN, 3)).toBeNaN()
  fc.assert(
    fc.property(
      fc.double({ min: -1e6, max: 1e6, noNaN: true }),
      fc.double({ min: 0.1, max: 8, noNaN: true }),
      (angle, exponent) => {
        const power = cosineLaw(angle, exponent)
        expect(power).toBeGreaterThanOrEqual(0)
        expect(power).toBeLessThanOrEqual(1)
        expect(Math.abs(power + lossShare(angle, exponent) - 1)).toBeLessThan(1e-9)
      },
    ),
  )
})

test('an exponent that is not above 0 is refused', () => {
  for (const exponent of [0, -1, NaN]) {
    expect(() => cosineLaw(5, exponent)).toThrow(outOfRange)
    expect(() => lossShare(5, exponent)).toThrow(outOfRange)
    expect(() => expectedCosinePower(5, 4, exponent)).toThrow(outOfRange)
    expect(() => expectedCosinePowerVonMises(5, 50, exponent)).toThrow(outOfRange)
  }
  expect(() => expectedCosinePower(5, -1, 3)).toThrow(outOfRange)
  expect(() => expectedCosinePowerVonMises(5, -1, 3)).toThrow(outOfRange)
})

test('the mean of cos^3 and cos^2 under a normal spread is that of the reference runs', () => {
  // Reference runs (numpy) of the closed form; the next test takes the same numbers from a sum over the density.
  for (const [mean, sigma, expected] of [
    [0, 4, 0.9927510989953964],
    [0, 6, 0.9838613702978573],
    [0, 8, 0.9717267817860693],
    [0, 10, 0.9566389879568745],
    [3, 4, 0.9887146082866203],
    [3, 10, 0.9529430342313783],
    [5, 0, 0.9886274801410763],
    [5, 4, 0.9815703242488771],
    [5, 8, 0.9610974333065916],
    [8, 6, 0.9560293984254387],
    [10, 6, 0.9406485663007141],
    [10, 10, 0.916213839650817],
  ] as const) {
    expect(Math.abs(expectedCosinePower(mean, sigma, 3) - expected)).toBeLessThan(1e-9)
  }
  for (const [mean, sigma, expected] of [
    [0, 6, 0.9891531566389997],
    [0, 10, 0.9704476153006749],
    [5, 6, 0.9817218210684819],
    [10, 10, 0.9420761525643719],
  ] as const) {
    expect(Math.abs(expectedCosinePower(mean, sigma, 2) - expected)).toBeLessThan(1e-9)
  }
})

/** Sum over a fine even grid, which for smooth densities that vanish at the ends is right to rounding. */
function summed(density: (deg: number) => number, exponent: number, from: number, to: number): number {
  const steps = 200_000
  let sum = 0
  let weight = 0
  for (let i = 0; i < steps; i++) {
    const angle = from + ((i + 0.5) * (to - from)) / steps
    const d = density(angle)
    sum += d * Math.pow(Math.max(Math.cos(angle * RAD), 0), exponent)
    weight += d
  }
  return sum / weight
}

test('any exponent and any spread agree with a plain sum over the normal density', () => {
  for (const exponent of [1, 1.4, 2, 2.5, 3, 5]) {
    for (const [mean, sigma] of [
      [0, 5],
      [5, 4],
      [-12, 9],
      [40, 0.5],
      [85, 3],
      [30, 40],
      [170, 70],
    ] as const) {
      const density = (deg: number) => Math.exp(-(((deg - mean) / sigma) ** 2) / 2)
      const expected = summed(density, exponent, mean - 9 * sigma, mean + 9 * sigma)
      const got = expectedCosinePower(mean, sigma, exponent)
      // The plain sum meets the kink at 90 degrees with an error of order (step)^(1 + exponent).
      expect(Math.abs(got - expected), `p ${exponent} mean ${mean} sigma ${sigma}`).toBeLessThan(2e-8)
    }
  }
})

test('numerical integration meets the closed forms to 1e-11', () => {
  for (const mean of [0, 3, 8, 20]) {
    for (const sigma of [0.01, 1, 4, 7]) {
      const cosine = (k: number) => Math.cos(k * mean * RAD) * Math.exp(-((k * sigma * RAD) ** 2) / 2)
      // Power-reduction formulae for p = 4 and 5, which the program integrates.
      const fourth = (3 + 4 * cosine(2) + cosine(4)) / 8
      const fifth = (10 * cosine(1) + 5 * cosine(3) + cosine(5)) / 16
      expect(Math.abs(expectedCosinePower(mean, sigma, 4) - fourth)).toBeLessThan(1e-11)
      expect(Math.abs(expectedCosinePower(mean, sigma, 5) - fifth)).toBeLessThan(1e-11)
    }
  }
})

test('a uniform direction leaves the mean of the half wave', () => {
  // Integral of cos^p over -90..90 divided by a turn: p = 1: 2, p = 2: pi/2, p = 3: 4/3.
  for (const [exponent, area] of [
    [1, 2],
    [2, Math.PI / 2],
    [3, 4 / 3],
  ] as const) {
    expect(Math.abs(expectedCosinePower(33, 1e9, exponent) - area / (2 * Math.PI))).toBeLessThan(1e-11)
    expect(Math.abs(expectedCosinePowerVonMises(33, 0, exponent) - area / (2 * Math.PI))).toBeLessThan(1e-11)
  }
})

test('the mean of cos^3 under a von Mises spread is that of the reference runs', () => {
  // Reference runs (scipy) of (3 A1 cos mu + A3 cos 3 mu) / 4, which counts the backward half as negative: 1e-12 here.
  for (const [mean, kappa, expected] of [
    [0, 20, 0.9295438604292563],
    [0, 50, 0.9707409265524005],
    [0, 100, 0.9851863704797699],
    [5, 20, 0.9199970539469349],
    [5, 50, 0.9601372103813225],
    [5, 100, 0.9742048178834819],
  ] as const) {
    expect(Math.abs(expectedCosinePowerVonMises(mean, kappa, 3) - expected)).toBeLessThan(1e-9)
  }
})

test('a von Mises spread agrees with a plain sum over its density', () => {
  for (const exponent of [1.4, 2, 3]) {
    for (const [mean, kappa] of [
      [0, 0.5],
      [50, 3],
      [-100, 8],
      [5, 4000],
      [179, 1],
    ] as const) {
      const density = (deg: number) => Math.exp(kappa * (Math.cos((deg - mean) * RAD) - 1))
      const expected = summed(density, exponent, mean - 180, mean + 180)
      expect(Math.abs(expectedCosinePowerVonMises(mean, kappa, exponent) - expected)).toBeLessThan(2e-8)
    }
  }
})

test('no spread leaves the cosine law, and missing numbers give NaN', () => {
  expect(expectedCosinePower(7, 0, 2.2)).toBe(cosineLaw(7, 2.2))
  expect(expectedCosinePowerVonMises(7, Infinity, 2.2)).toBe(cosineLaw(7, 2.2))
  expect(expectedCosinePower(7, 5e-324, 2.2)).toBe(cosineLaw(7, 2.2))
  expect(expectedCosinePowerVonMises(7, 1e14, 2.2)).toBeCloseTo(cosineLaw(7, 2.2), 11)
  expect(expectedCosinePower(NaN, 4, 3)).toBeNaN()
  expect(expectedCosinePower(4, NaN, 3)).toBeNaN()
  expect(expectedCosinePowerVonMises(4, NaN, 3)).toBeNaN()
  expect(staticShareGivenDynamic(NaN, 4, 3)).toBeNaN()
})

test('the static share on top of a spread is that of the reference runs', () => {
  // Reference runs (numpy), percent; (5, 4) is also 1 - .9815703242 / .9927510990 of the values above.
  for (const [mean, sigma, expected] of [
    [3, 4, 0.4065964482800166],
    [5, 4, 1.126241487703561],
    [8, 10, 2.7213610916213216],
    [10, 0, 4.488783429473431],
    [10, 10, 4.225747519698608],
  ] as const) {
    expect(Math.abs(100 * staticShareGivenDynamic(mean, sigma, 3) - expected)).toBeLessThan(1e-9)
  }
})

test('the expected share lies between 0 and 1 and falls as the misalignment grows either way', () => {
  fc.assert(
    fc.property(
      fc.double({ min: 0, max: 170, noNaN: true }),
      fc.double({ min: 0.5, max: 10, noNaN: true }),
      fc.oneof(fc.constant(0), fc.double({ min: 1e-6, max: 100, noNaN: true })),
      fc.double({ min: 0.5, max: 6, noNaN: true }),
      (mean, further, sigma, exponent) => {
        const here = expectedCosinePower(mean, sigma, exponent)
        expect(here).toBeGreaterThanOrEqual(0)
        expect(here).toBeLessThanOrEqual(1)
        expect(expectedCosinePower(mean + further, sigma, exponent)).toBeLessThanOrEqual(here + 1e-11)
        expect(Math.abs(expectedCosinePower(-mean, sigma, exponent) - here)).toBeLessThan(1e-12)
        if (mean + further + 3 * sigma < 85) {
          expect(expectedCosinePower(mean + further, sigma, exponent)).toBeLessThan(here)
        }
        const kappa = 1 + 200 * sigma
        const spread = expectedCosinePowerVonMises(mean, kappa, exponent)
        expect(spread).toBeGreaterThanOrEqual(0)
        expect(spread).toBeLessThanOrEqual(1)
        expect(expectedCosinePowerVonMises(mean + further, kappa, exponent)).toBeLessThanOrEqual(
          spread + 1e-11,
        )
      },
    ),
  )
})
