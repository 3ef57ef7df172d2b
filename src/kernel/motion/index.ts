export { codesVisited, type CodesVisited } from './codes-visited.ts'
export { frozenRuns, type FrozenRuns } from './frozen-runs.ts'
export { resolutionOf, type Resolution } from './resolution.ts'
export { yawMoves, type YawMoveOptions, type YawMoves } from './yaw-moves.ts'
