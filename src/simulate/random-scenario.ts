import { PURPOSE, RandomStream } from './random.ts'
import { farmScenario, type FarmScenario } from './scenario.ts'

/**
 * A farm unlike the last one: controller, vane, anemometer, turbulence, wind, turbine and layout drawn from ranges that
 * farms show (common practice, no source). Truth that is to be found - offsets - is drawn as always; what an estimator
 * is tried against - anemometer response, link, gain, exponent - stays at the defaults unless overridden.
 *
 * @param seed 0 to 2^32 - 1: draws the farm, and is the seed of its weather unless overridden
 * @throws InputError OUT_OF_RANGE, LENGTH_MISMATCH
 */
export function randomScenario(seed: number, overrides: Partial<FarmScenario> = {}): FarmScenario {
  const stream = new RandomStream(seed, PURPOSE.scenario)
  const rotorDiameterM = Math.round(stream.between(80, 130))
  const ratedWindMs = stream.between(11, 13)
  const drawn: Partial<FarmScenario> = {
    seed,
    rotorDiameterM,
    hubHeightM: Math.round(rotorDiameterM * stream.between(0.75, 1.1)),
    ratedWindMs,
    // About 270 W for each square metre of rotor at a rated wind of 12 m/s.
    ratedPowerKw: Math.round((0.000213 * rotorDiameterM ** 2 * (ratedWindMs / 12) ** 3 * 1000) / 50) * 50,
    altitudeM: Math.round(stream.between(0, 700)),
    meanWindMs: stream.between(6, 8.5),
    turbulenceIntensity: stream.between(0.06, 0.12),
    directionSdDeg: stream.between(3.2, 5.5),
    localSpeedSd: stream.between(0.02, 0.045),
    localDirectionSdDeg: stream.between(1.2, 3),
    turningDegPerHour: stream.between(3, 7),
    vaneNoiseDeg: stream.between(1.5, 5),
    vaneSlowNoiseDeg: stream.between(0.3, 1),
    vaneDecimals: stream.uniform() < 0.5 ? 1 : 2,
    anemometerGainSpread: stream.between(0.01, 0.03),
    anemometerSlowError: stream.between(0.015, 0.03),
    anemometerNoiseMs: stream.between(0.1, 0.3),
    performanceDrift: stream.between(0.005, 0.015),
    yawAverageS: Math.round(stream.between(60, 150)),
    yawThresholdDeg: stream.between(6, 10),
    yawHoldS: Math.round(stream.between(45, 110)),
    yawStopDeg: stream.between(0.8, 2.5),
    yawRateDegS: stream.between(0.25, 0.6),
    layout: {
      columns: 3 + Math.floor(stream.uniform() * 4),
      spacingD: stream.between(3.5, 6.5),
      rowSpacingD: stream.between(5, 9),
      bearingDeg: stream.between(0, 180),
    },
  }
  return farmScenario({ ...drawn, ...overrides })
}
