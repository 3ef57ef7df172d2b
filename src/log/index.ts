export {
  DEFAULT_LIMITS,
  type LogLimits,
  type LogParts,
  type LogReading,
  type LogSource,
  type StagedLog,
} from './contract.ts'
export { stageLog } from './stage-log.ts'
export { describeLog, type LogDescription } from './describe-log.ts'
