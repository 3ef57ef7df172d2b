import { farmScenario, randomScenario, type FarmScenario } from '../../src/simulate/index.ts'

const FIRST_SEED = 20_000
/** Standing misalignments of a farm's turbines, degrees, in turn and from another one on in every farm. */
const STANDING_DEG = [0, 2, -5, 1, -2, 5, -1, 2, 7] as const

const BASE: Partial<FarmScenario> = {
  turbines: 9,
  days: 30,
  anemometerResponsePerDeg: -0.003,
  anemometerResponseSpread: 0.0003,
}

/** Simulated farms that have something in common. */
export interface Stratum {
  readonly name: string
  /** What differs from farms of nine over 30 days with a response of -0.3 % and a spread of 0.03 % per degree. */
  readonly differs: Partial<FarmScenario>
  /** Controller, vane, anemometer, turbulence, wind, turbine and layout are drawn for every farm. */
  readonly drawn?: boolean
  /** The offsets with the response given exactly are worked out too: no estimator that has to find it can do better. */
  readonly floor?: boolean
  /** The program states another assumption: such an interval need not hold the truth. */
  readonly outside?: boolean
}

/** Those named first are worked out first. */
export const STRATA: readonly Stratum[] = [
  { name: 'response -0.3, spread 0.03', differs: {}, floor: true },
  { name: 'farms drawn at random', differs: {}, drawn: true, floor: true },
  { name: 'spread 0.07', differs: { anemometerResponseSpread: 0.0007 } },
  { name: 'link +0.2', differs: { linkCorrelation: 0.2 } },
  { name: 'link -0.2', differs: { linkCorrelation: -0.2 } },
  { name: 'true p 2, read at 3', differs: { exponent: 2 } },
  { name: 'spread 0', differs: { anemometerResponseSpread: 0 } },
  { name: 'response 0', differs: { anemometerResponsePerDeg: 0 } },
  { name: '1 turbine', differs: { turbines: 1 } },
  { name: '3 turbines', differs: { turbines: 3 } },
  { name: 'vane logged before correction', differs: { vaneLogged: 'beforeCorrection' } },
  { name: 'true p 1.4, read at 3', differs: { exponent: 1.4 } },
  { name: 'vane gain 1.3, taken as 1', differs: { vaneGain: 1.3 }, outside: true },
  { name: 'response +0.1', differs: { anemometerResponsePerDeg: 0.001 } },
  { name: 'response -0.1', differs: { anemometerResponsePerDeg: -0.001 } },
  { name: 'response +0.3', differs: { anemometerResponsePerDeg: 0.003 } },
  { name: 'vane noise 0', differs: { vaneNoiseDeg: 0, vaneSlowNoiseDeg: 0 } },
  { name: 'vane noise 2', differs: { vaneNoiseDeg: 2 } },
  { name: 'response bent oddly (2e-5 v^3)', differs: { anemometerResponseCubePerDeg3: 2e-5 } },
  { name: 'response with a square (-1.5e-4 v^2)', differs: { anemometerResponseSquarePerDeg2: -1.5e-4 } },
  { name: '25 turbines', differs: { turbines: 25 } },
  { name: '12 turbines, spread 0.07', differs: { turbines: 12, anemometerResponseSpread: 0.0007 } },
  { name: 'drawn, p 2, link +0.2', differs: { exponent: 2, linkCorrelation: 0.2 }, drawn: true },
  { name: 'drawn, p 2, link -0.2', differs: { exponent: 2, linkCorrelation: -0.2 }, drawn: true },
  {
    name: '12 turbines, 90 days, spread 0.07',
    differs: { turbines: 12, days: 90, anemometerResponseSpread: 0.0007 },
    floor: true,
  },
]

/** Farm k of a stratum: other weather, layout and order of offsets in each. */
export function farmOf(stratum: Stratum, k: number): FarmScenario {
  const given = { ...BASE, ...stratum.differs }
  const turbines = given.turbines!
  const seed = FIRST_SEED + k
  const side = k % 2 === 0 ? 1 : -1
  const offsetsDeg = Array.from(
    { length: turbines },
    (_, i) => side * STANDING_DEG[(i + 2 * k) % STANDING_DEG.length]! * (given.vaneGain ?? 1),
  )
  const own: Partial<FarmScenario> = {
    ...given,
    seed,
    offsetsDeg,
    correctionsDeg:
      given.vaneLogged === 'beforeCorrection' ? Array.from({ length: turbines }, (_, i) => i - 4) : null,
  }
  if (stratum.drawn) return randomScenario(seed, own)
  return farmScenario({
    ...own,
    layout: {
      columns: 3 + (k % 2),
      spacingD: 4.5 + (k % 3) * 0.5,
      rowSpacingD: 6,
      bearingDeg: (k * 37) % 180,
    },
  })
}
