export { ACROSS_NORTH_CHANNELS, type AcrossNorthChannel } from './across-north.ts'
export * from './build-frame.ts'
export * from './calendar.ts'
export * from './frame.ts'
export {
  countReasons,
  REASON_CODE,
  setAsideBeforeCurve,
  setAsideByRange,
  type EarlySetAside,
  type SetAsideInput,
} from './set-aside.ts'
export { correctSpeed } from './correct-speed.ts'
export type { SensorSpell } from './still-spells.ts'
export {
  DECODED_CHANNELS,
  decodingPlan,
  holdsRawWords,
  RawWordDecoder,
  type DecodedChannel,
  type DecodingAccount,
} from './raw-words.ts'
export { reasonsSince, rowsBetween, rowsSince } from './rows-since.ts'
