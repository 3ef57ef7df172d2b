import type { TurbineColumns } from '../frame/index.ts'
import type { Receipt, ScoreSheet, ScoringSettings, SiteFile } from '../sheet/index.ts'
import { isHighRate, type CsvColumn, type Store } from '../store/index.ts'
import type { Progress } from './contract.ts'
import { decodeLog } from './decode-log.ts'
import { examineHighRate, isExamined } from './examine-high-rate.ts'
import { frameRows, scoredIntervalS, type KeptRequest } from './frame-rows.ts'
import { scoreFarm } from './score-farm.ts'
import type { ScoreTask } from './score-turbine.ts'
import type { Scorers } from './scorers.ts'
import { writeParquetTable } from './table-files.ts'

export interface RowsToScore {
  readonly id: string
  /** Parquet of clean rows, in the data folder; taken over. */
  readonly path: string
  /** As it will stand in the sheet: its interval is that of the rows as they came. */
  readonly receipt: Receipt
  /** Intervals of the logs that the rows come from, s. */
  readonly loggedIntervalsS: readonly (number | null)[]
  readonly site: SiteFile
  readonly settings: ScoringSettings
  readonly ratedPowerKw?: number | undefined
  readonly reading: Record<string, unknown>
  /** Whether the rows as they came are kept elsewhere, so that those that were scored are enough here. */
  readonly keepScoredOnly: boolean
}

/** Scores clean rows and keeps sheet and rows under the replay, which is noted as running. */
export async function scoreRows(
  parts: { store: Store; scorers: Scorers; version: string; clock: () => number },
  work: RowsToScore,
  signal: AbortSignal,
  onProgress: (progress: Progress) => void,
): Promise<ScoreSheet> {
  const { store } = parts
  const { receipt, site, settings, ratedPowerKw } = work
  onProgress({ stage: 'framing', share: 0 })
  const { path, warnings, findings } = await decodeLog(store, work.path, site, signal)
  const reducedFromS = work.loggedIntervalsS.some(isHighRate) ? finest(work.loggedIntervalsS) : null
  const farm = await frameRows(store.scans, path, reducedFromS)
  signal.throwIfAborted()
  const intervalS = scoredIntervalS(reducedFromS, receipt.intervalS)
  const responsesPerDeg: Record<string, number> = {}
  const scorers: Scorers = {
    ...parts.scorers,
    score: (task) => {
      responsesPerDeg[task.frame.turbine] = responseOf(task)
      return parts.scorers.score(task)
    },
  }
  const scored = await scoreFarm(
    farm,
    {
      replay: work.id,
      version: parts.version,
      site,
      settings,
      ratedPowerKw,
      receipt: { ...receipt, intervalS },
      reading: work.reading,
      decodingFindings: findings,
      examine:
        reducedFromS !== null && isExamined(reducedFromS)
          ? (turbines) => examineHighRate({ store, scorers }, path, turbines, signal, onProgress)
          : undefined,
    },
    scorers,
    (done, of) => {
      onProgress({ stage: 'scoring', share: done / of })
    },
  )
  signal.throwIfAborted()
  onProgress({ stage: 'writing', share: 0 })
  const reduced = reducedFromS === null ? [] : [reductionNote(receipt, farm)]
  const sheet: ScoreSheet = { ...scored, receipt, warnings: [...scored.warnings, ...warnings, ...reduced] }
  const scoredOnly = reducedFromS !== null && work.keepScoredOnly
  if (scoredOnly) await writeScored(store, path, farm)
  await store.frames.keep(work.id, path)
  const kept: KeptRequest = {
    site,
    settings,
    ratedPowerKw: ratedPowerKw ?? null,
    reducedFromS: scoredOnly ? null : reducedFromS,
    responsesPerDeg,
  }
  await store.replays.finish(work.id, JSON.stringify(sheet), parts.clock(), JSON.stringify(kept))
  return sheet
}

/** As the static offset takes it: a stated one, else what neighbours tell, else none. */
function responseOf({ settings, response }: ScoreTask): number {
  const stated = settings.assumedResponsePctPerDeg
  return stated === null ? (response?.perDeg ?? 0) : stated / 100
}

function finest(intervalsS: readonly (number | null)[]): number {
  return Math.min(...intervalsS.filter((intervalS) => intervalS !== null))
}

function reductionNote(receipt: Receipt, farm: readonly TurbineColumns[]): string {
  const intervals = farm.reduce((sum, { time }) => sum + time.length, 0)
  return (
    `time: ${receipt.accepted} rows of mostly ${receipt.intervalS ?? '?'} s were reduced to ${intervals} intervals of 600 s, ` +
    'which are what the turbines’ rows count'
  )
}

/** In place of the rows as they came: kept for a month of one turbine at 1 Hz, those would take some 50 MB. */
async function writeScored(store: Store, path: string, farm: readonly TurbineColumns[]): Promise<void> {
  const schema: Record<string, CsvColumn> = { turbine: 'text', time: 'integer' }
  for (const { numbers, texts } of farm) {
    for (const name of Object.keys(numbers)) schema[name] = 'number'
    for (const name of Object.keys(texts)) schema[name] = 'text'
  }
  const parts = farm.map(({ turbine, time, numbers, texts }) => ({
    rows: time.length,
    columns: { ...numbers, ...texts, time, turbine: Array.from(time, () => turbine) },
  }))
  await writeParquetTable(store.scans, path, schema, parts)
}
