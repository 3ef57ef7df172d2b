import { compareNeighbours } from '../analysis/index.ts'
import { scoreTurbine } from './score-turbine.ts'
import type { Work, WorkAnswer } from './scorers.ts'

/** What a worker thread runs. */
export default function work(task: Work): WorkAnswer {
  if (task.kind === 'turbine') return scoreTurbine(task.task)
  return compareNeighbours(task.farm, task.days, task.dayWeights, task.settings)
}
