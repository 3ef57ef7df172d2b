import { compareNeighbours, examineDay, proveCorrections } from '../analysis/index.ts'
import { scoreTurbine } from './score-turbine.ts'
import type { Work, WorkAnswer } from './scorers.ts'

/** What a worker thread runs. */
export default function work(task: Work): WorkAnswer {
  if (task.kind === 'turbine') return scoreTurbine(task.task)
  if (task.kind === 'high-rate-day') return examineDay(task.rows)
  if (task.kind === 'proof') return proveCorrections(task.question)
  return compareNeighbours(task.farm, task.days, task.dayWeights, task.settings)
}
