export { besselRatio } from './bessel-ratio.ts'
export { circularMean, resultantLength, unitVectorMean, type CircularMean } from './circular-mean.ts'
export { circularMedian, meanDeviation } from './circular-median.ts'
export { circularMoment, type CircularMoment } from './circular-moment.ts'
export { circularQuantiles } from './circular-quantiles.ts'
export { circularDispersion, circularKurtosis, circularSkewness } from './circular-shape.ts'
export {
  angularDeviation,
  angularDeviationFromResultant,
  circularSd,
  circularSdFromResultant,
  circularVariance,
} from './circular-spread.ts'
export { intervalStatistics, type IntervalStatistics } from './interval-statistics.ts'
export {
  meanDirectionInterval,
  meanDirectionIntervalVonMises,
  type MeanDirectionInterval,
} from './mean-direction-interval.ts'
export { mitsutaStatistics, type MitsutaStatistics } from './mitsuta-statistics.ts'
export { DEG_PER_RAD, RAD_PER_DEG } from './radians.ts'
export { rayleighTest, type RayleighTest } from './rayleigh-test.ts'
export { unwrap } from './unwrap.ts'
export { vonMisesKappa, vonMisesKappaCorrected } from './von-mises-kappa.ts'
export { signedDifference, wrap180, wrap360 } from './wrap.ts'
export { yamartinoSigma } from './yamartino-sigma.ts'
