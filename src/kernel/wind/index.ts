export { airDensity, REFERENCE_DENSITY, type AirState } from './air-density.ts'
export { annualEnergy, type AnnualEnergy, type AnnualEnergyOptions } from './annual-energy.ts'
export { cosineLaw, lossShare } from './cosine-law.ts'
export { normalisedSpeed, normalisedStallPower } from './density-normalisation.ts'
export {
  expectedCosinePower,
  expectedCosinePowerVonMises,
  staticShareGivenDynamic,
} from './expected-cosine-power.ts'
export { measuredPowerCurve, powerAt, type CurveOptions, type MeasuredCurve } from './power-curve.ts'
export { kneeSpeed, ratedPowerFrom } from './rated-power.ts'
export { pressureFromAltitude } from './standard-atmosphere.ts'
export { steepnessAt } from './steepness.ts'
export { rayleighCumulative, weibullCumulative, weibullScale, weibullShapeFrom } from './wind-distribution.ts'
