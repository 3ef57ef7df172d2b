export {
  simulateFarm,
  type SimulatedFarm,
  type SimulatedTurbine,
  type TurbineTruth,
} from './simulate-farm.ts'
export {
  farmScenario,
  type FarmScenario,
  type LimitSpell,
  type OffsetChange,
  type Spell,
} from './scenario.ts'
export { ROW_COLUMNS, STATES, type RowColumn } from './rows.ts'
export { powerTable, powerAt } from './power-curve.ts'
