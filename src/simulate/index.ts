export { DEMO_SCENARIO } from './demo-scenario.ts'
export { FAULT_KINDS, FAULTS, type Fault, type FaultKind, type Spell } from './faults.ts'
export { emptyAccount, logCsv, type LogAccount } from './log-csv.ts'
export { powerAt, powerTable } from './power-curve.ts'
export { randomScenario } from './random-scenario.ts'
export { ROW_COLUMNS, STATES, type RowColumn } from './rows.ts'
export {
  farmScenario,
  type Correction,
  type FarmScenario,
  type LimitSpell,
  type OffsetChange,
} from './scenario.ts'
export {
  simulateFarm,
  type FaultTruth,
  type SimulatedFarm,
  type SimulatedTurbine,
  type TurbineTruth,
} from './simulate-farm.ts'
export { turbineNames } from './turbine-plan.ts'
export { siteFileOf, truthDocument, writeSimulation, type WrittenSimulation } from './write-simulation.ts'
