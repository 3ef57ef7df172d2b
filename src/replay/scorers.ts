import { existsSync } from 'node:fs'
import { fileURLToPath } from 'node:url'
import { Piscina } from 'piscina'
import type { TurbineSheet } from '../sheet/index.ts'
import { scoreTurbine, type ScoreTask } from './score-turbine.ts'

/** Scores turbines, on this thread or on several. The sheet is the same either way. */
export interface Scorers {
  score(task: ScoreTask): Promise<TurbineSheet>
  close(): Promise<void>
}

/**
 * @param threads  worker threads; 0: score on this thread.
 */
export function openScorers(threads: number): Scorers {
  if (threads === 0) {
    return { score: (task) => Promise.resolve(scoreTurbine(task)), close: () => Promise.resolve() }
  }
  const pool = new Piscina<ScoreTask, TurbineSheet>({
    filename: workerFile(),
    minThreads: 0,
    maxThreads: threads,
    idleTimeout: 10_000,
  })
  return { score: (task) => pool.run(task), close: () => pool.close() }
}

/** Worker threads load compiled code: when this file runs as source, its compiled twin is taken. */
function workerFile(): string {
  const beside = fileURLToPath(new URL('./score-worker.js', import.meta.url))
  if (existsSync(beside)) return beside
  const compiled = fileURLToPath(new URL('../../dist/replay/score-worker.js', import.meta.url))
  if (existsSync(compiled)) return compiled
  throw new Error('score-worker.js is not built: run npm run build')
}
