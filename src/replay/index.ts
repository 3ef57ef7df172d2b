export type {
  LogFile,
  OneShotRequest,
  Progress,
  ReplayRecord,
  Replays,
  ReplayStateName,
  RowsExport,
  RowsFormat,
  StoredRequest,
} from './contract.ts'
export { CAUTION_IN_SHORT, CAUTIONS } from './cautions.ts'
export { correctionInWords } from './advice.ts'
export { createReplays, type ReplayParts } from './create-replays.ts'
export { openScorers, type Scorers } from './scorers.ts'
