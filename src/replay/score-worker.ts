import { scoreTurbine, type ScoreTask } from './score-turbine.ts'

/** What a worker thread runs. */
export default function work(task: ScoreTask): ReturnType<typeof scoreTurbine> {
  return scoreTurbine(task)
}
