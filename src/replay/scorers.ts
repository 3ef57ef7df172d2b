import { existsSync } from 'node:fs'
import { fileURLToPath } from 'node:url'
import { Piscina } from 'piscina'
import {
  buffersOf,
  compareNeighbours,
  examineDay,
  proveCorrections,
  type DayWeights,
  type FarmRows,
  type HighRateDay,
  type HighRateRows,
  type Neighbours,
  type ProveQuestion,
} from '../analysis/index.ts'
import type { CorrectionProof, ScoringSettings, TurbineSheet } from '../sheet/index.ts'
import { scoreTurbine, type ScoreTask } from './score-turbine.ts'

export interface FarmTask {
  readonly farm: FarmRows
  readonly days: number
  readonly dayWeights: readonly DayWeights[]
  readonly settings: ScoringSettings
}

/** What travels to a worker thread, and back. */
export type Work =
  | { readonly kind: 'turbine'; readonly task: ScoreTask }
  | ({ readonly kind: 'farm' } & FarmTask)
  | { readonly kind: 'high-rate-day'; readonly rows: HighRateRows }
  | { readonly kind: 'proof'; readonly question: ProveQuestion }
export type WorkAnswer = TurbineSheet | Neighbours | HighRateDay | CorrectionProof[] | null

/** Runs the heavy questions, on this thread or on several. The sheet is the same either way. */
export interface Scorers {
  score(task: ScoreTask): Promise<TurbineSheet>
  /** Compares neighbours; null where there is nothing to compare. */
  compare(task: FarmTask): Promise<Neighbours | null>
  /** Examines a day of high-rate rows, whose arrays are handed over: they are not to be used afterwards. */
  examine(rows: HighRateRows): Promise<HighRateDay>
  /** Holds corrections against what came after them. */
  prove(question: ProveQuestion): Promise<CorrectionProof[]>
  close(): Promise<void>
}

/**
 * @param threads  worker threads; 0: score on this thread.
 */
export function openScorers(threads: number): Scorers {
  if (threads === 0) {
    return {
      score: (task) => Promise.resolve(scoreTurbine(task)),
      compare: (task) =>
        Promise.resolve(compareNeighbours(task.farm, task.days, task.dayWeights, task.settings)),
      examine: (rows) => Promise.resolve(examineDay(rows)),
      prove: (question) => Promise.resolve(proveCorrections(question)),
      close: () => Promise.resolve(),
    }
  }
  const pool = new Piscina<Work, WorkAnswer>({
    filename: workerFile(),
    minThreads: 0,
    maxThreads: threads,
    idleTimeout: 10_000,
  })
  return {
    score: async (task) => (await pool.run({ kind: 'turbine', task })) as TurbineSheet,
    compare: async (task) => (await pool.run({ kind: 'farm', ...task })) as Neighbours | null,
    examine: async (rows) =>
      (await pool.run({ kind: 'high-rate-day', rows }, { transferList: buffersOf(rows) })) as HighRateDay,
    prove: async (question) => (await pool.run({ kind: 'proof', question })) as CorrectionProof[],
    close: () => pool.close(),
  }
}

/** Worker threads load compiled code: when this file runs as source, its compiled twin is taken. */
function workerFile(): string {
  const beside = fileURLToPath(new URL('./score-worker.js', import.meta.url))
  if (existsSync(beside)) return beside
  const compiled = fileURLToPath(new URL('../../dist/replay/score-worker.js', import.meta.url))
  if (existsSync(compiled)) return compiled
  throw new Error('score-worker.js is not built: run npm run build')
}
