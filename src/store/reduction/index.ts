export { isHighRate, REDUCED_INTERVAL_S } from './high-rate.ts'
export { reduceRows } from './reduce-rows.ts'
