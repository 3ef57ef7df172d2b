export { DEMO_SCENARIO } from './demo-scenario.ts'
export { emptyAccount, logCsv, type LogAccount } from './log-csv.ts'
export { powerAt, powerTable } from './power-curve.ts'
export { randomScenario } from './random-scenario.ts'
export { ROW_COLUMNS, STATES, type RowColumn } from './rows.ts'
export {
  farmScenario,
  type FarmScenario,
  type LimitSpell,
  type OffsetChange,
  type SensorFault,
  type Spell,
} from './scenario.ts'
export {
  simulateFarm,
  type SimulatedFarm,
  type SimulatedTurbine,
  type TurbineTruth,
} from './simulate-farm.ts'
export { siteFileOf, truthDocument, writeSimulation, type WrittenSimulation } from './write-simulation.ts'
