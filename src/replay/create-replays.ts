import { mkdir, rm } from 'node:fs/promises'
import { join } from 'node:path'
import PQueue from 'p-queue'
import { InputError } from '../errors.ts'
import { decodingPlan } from '../frame/index.ts'
import { stageLog, type LogLimits, type StagedLog } from '../log/index.ts'
import {
  crossedSettings,
  type Receipt,
  type ScoreSheet,
  type ScoringSettings,
  type SiteFile,
} from '../sheet/index.ts'
import type { Store, StoredReplay } from '../store/index.ts'
import type { OneShotRequest, Progress, ReplayRecord, Replays, StoredRequest } from './contract.ts'
import { frameRows, type KeptRequest } from './frame-rows.ts'
import { guardedScorers } from './guarded-scorers.ts'
import { exportRows } from './rows-export.ts'
import { RunningReplays, type Run } from './running-replays.ts'
import { scoreRows, type RowsToScore } from './score-rows.ts'
import type { Scorers } from './scorers.ts'
import { checkStored, readStored } from './stored-window.ts'
import { newestProofs } from './trend/newest-proofs.ts'
import { sheetBefore, sheetsOf } from './trend/stored-sheets.ts'
import { trendOf } from './trend/trend.ts'
import { whatIsNew } from './trend/what-is-new.ts'

/** Newest sheets that are looked through for what became of corrections. */
const SHEETS_FOR_PROOFS = 24

export interface ReplayParts {
  readonly store: Store
  readonly limits: LogLimits
  readonly scorers: Scorers
  /** Of this program, for the provenance. */
  readonly version: string
  readonly clock: () => number
  readonly newId: () => string
  /** Replays of the queue that run side by side. Default 1. */
  readonly replaysAtOnce?: number
  /** Told of faults of this program in replays that run in the background. Default: nobody. */
  readonly report?: (error: unknown) => void
}

/** Runs replays over the given store and keeps their sheets and frames in it. */
export function createReplays(parts: ReplayParts): Replays {
  const { store, clock, report = () => undefined } = parts
  const running = new RunningReplays()
  const queue = new PQueue({ concurrency: parts.replaysAtOnce ?? 1 })

  const score = (work: RowsToScore, { signal, onProgress }: Run) => {
    const scorers = { ...parts.scorers, ...guardedScorers(parts.scorers, signal) }
    return scoreRows({ store, scorers, version: parts.version, clock }, work, signal, onProgress)
  }

  const scoreStored = async (id: string, request: StoredRequest, run: Run, folder: string) => {
    run.onProgress({ stage: 'reading', share: 0 })
    const window = await readStored(store, request, folder)
    checkChannels(window, window.site)
    run.signal.throwIfAborted()
    return score({ ...request, ...window, id, keepScoredOnly: true }, run)
  }

  /** A replay whose caller waits for the sheet: when it fails, the caller has the error in hand and nothing is listed. */
  const inForeground = async (
    work: (id: string, run: Run, folder: string) => Promise<ScoreSheet>,
    onProgress?: (progress: Progress) => void,
  ): Promise<ScoreSheet> => {
    const id = parts.newId()
    const run = running.enter(id, onProgress)
    return running.carry(id, async () => {
      try {
        return await withFolder(store, id, (folder) => work(id, run, folder))
      } catch (error) {
        await store.frames.remove(id)
        if (run.signal.aborted) throw run.signal.reason
        await store.replays.remove(id)
        throw error
      }
    })
  }

  const inBackground = async (id: string, request: StoredRequest, run: Run): Promise<void> => {
    try {
      await store.replays.run(id)
      await withFolder(store, id, (folder) => scoreStored(id, request, run, folder))
    } catch (error) {
      await store.frames.remove(id)
      if (run.signal.aborted) return // cancelled, and noted so; or interrupted, which the next start notes
      if (!(error instanceof InputError)) report(error)
      await store.replays.fail(id, problemOf(error), clock())
    }
  }

  return {
    oneShot: (request, onProgress) =>
      inForeground(async (id, run, folder) => {
        checkSettings(request.settings)
        run.onProgress({ stage: 'reading', share: 0 })
        const staged = await stage(parts, folder, request)
        run.signal.throwIfAborted()
        await store.replays.begin({ id, site: request.site.site ?? null, createdMs: clock() })
        checkChannels(staged, request.site)
        const { site, settings, ratedPowerKw } = request
        const { path, receipt } = staged
        return score(
          {
            id,
            path,
            receipt,
            site,
            settings,
            ratedPowerKw,
            loggedIntervalsS: [receipt.intervalS],
            reading: { ...request.reading },
            keepScoredOnly: false,
          },
          run,
        )
      }, onProgress),
    stored: (request, onProgress) =>
      inForeground(async (id, run, folder) => {
        checkSettings(request.settings)
        await checkStored(store, request)
        await store.replays.begin({ id, site: request.site, createdMs: clock() })
        return scoreStored(id, request, run, folder)
      }, onProgress),
    async start(request) {
      checkSettings(request.settings)
      await checkStored(store, request)
      const id = parts.newId()
      const run = running.enter(id)
      try {
        await store.replays.begin({ id, site: request.site, createdMs: clock(), state: 'queued' })
      } catch (error) {
        running.leave(id)
        throw error
      }
      queue
        .add(() => running.carry(id, () => inBackground(id, request, run)), { signal: run.signal })
        .catch((error: unknown) => {
          running.leave(id)
          if (!run.signal.aborted) report(error)
        })
      return { id }
    },
    async rows(id, format) {
      const record = await store.replays.get(id)
      if (!record?.sheet) throw notFound(id, 'the id of a replay with a sheet')
      const path = await store.frames.path(id)
      const request = await store.replays.request(id)
      if (path === undefined || request === undefined) {
        throw new InputError(
          'FRAME_GONE',
          `replay ${id}: expected its rows, got none: they are kept for some days only; its sheet is still there`,
        )
      }
      const kept = JSON.parse(request) as KeptRequest
      const sheet = JSON.parse(record.sheet) as ScoreSheet
      const farm = await frameRows(store.scans, path, kept.reducedFromS)
      return exportRows(store, farm, {
        kept,
        format,
        intervalS: sheet.window.intervalS ?? 600,
        folder: join(store.tempFolder, `rows-${parts.newId()}`),
      })
    },
    async get(id): Promise<ReplayRecord> {
      const record = await store.replays.get(id)
      if (!record) throw notFound(id)
      return withProgress(record, running)
    },
    async list(page) {
      const { replays, next } = await store.replays.list({ ...page, sheets: false })
      return { replays: replays.map((record) => withProgress(record, running)), next }
    },
    async trend(site, page) {
      return trendOf(site, await sheetsOf(store, site, page.replays))
    },
    proofs: async (site) => newestProofs(await sheetsOf(store, site, SHEETS_FOR_PROOFS)),
    async news(id) {
      const record = await store.replays.get(id)
      if (!record?.sheet) throw notFound(id, 'the id of a replay with a sheet')
      if (record.site === null) return null
      const sheet = JSON.parse(record.sheet) as ScoreSheet
      return whatIsNew(sheet, await sheetBefore(store, record.site, id))
    },
    async remove(id) {
      if (running.has(id) && (await cancelled(store, id, clock()))) {
        running.cancel(id)
        return
      }
      await store.frames.remove(id)
      if (!(await store.replays.remove(id))) throw notFound(id)
    },
    async close() {
      queue.pause()
      await running.close()
    },
  }
}

/** A folder of its own: working files have fixed names, and replays run side by side. */
async function withFolder<T>(store: Store, id: string, work: (folder: string) => Promise<T>): Promise<T> {
  const folder = join(store.tempFolder, `replay-${id}`)
  await mkdir(folder)
  try {
    return await work(folder)
  } finally {
    await rm(folder, { recursive: true, force: true })
  }
}

/** False when it had ended in the meantime, or is not noted yet. */
async function cancelled(store: Store, id: string, nowMs: number): Promise<boolean> {
  try {
    await store.replays.cancel(id, nowMs)
    return true
  } catch (error) {
    if (error instanceof InputError && error.code === 'REPLAY_NOT_FOUND') return false
    throw error
  }
}

async function stage(parts: ReplayParts, folder: string, request: OneShotRequest): Promise<StagedLog> {
  const { site, reading } = request
  return stageLog(
    request.logs,
    {
      ...reading,
      ...(site.timezone === undefined ? {} : { defaultTimezone: site.timezone }),
      ...(site.stamp === undefined ? {} : { defaultStamp: site.stamp }),
    },
    { scans: parts.store.scans, folder, limits: parts.limits },
  )
}

/** The offset needs these; anything else in the log is welcome but not needed. Raw words count where the site file describes them. */
function checkChannels(
  { channels, receipt }: { channels: readonly string[]; receipt: Receipt },
  site: SiteFile,
): void {
  const plans = [{ turbine: '' }, ...(site.turbines ?? [])].map((setup) => decodingPlan(setup, channels))
  const has = (channel: string) =>
    channels.includes(channel) || plans.some(({ makes }) => makes.some((made) => made === channel))
  const isVaneWorkedOut = has('wind_direction') && has('nacelle_position')
  const missing = ['wind_speed', 'vane', 'power'].filter(
    (channel) => !has(channel) && !(channel === 'vane' && isVaneWorkedOut),
  )
  if (missing.length === 0) return
  const recognised = receipt.columns
    .filter(({ takenFor }) => takenFor !== null)
    .map(({ column, takenFor }) => (column === takenFor ? column : `${column} (as ${takenFor ?? ''})`))
  const others = receipt.columns.filter(({ takenFor }) => takenFor === null).map(({ column }) => column)
  throw new InputError(
    'LOG_COLUMNS_MISSING',
    `log: expected columns for ${missing.join(', ')}; recognised ${recognised.join(', ') || 'nothing'}; ` +
      `not used ${others.join(', ') || 'nothing'}. Name them in columns, such as {"${missing[0]!}":"..."}` +
      plans[0]!.missing.map((line) => `; ${line}`).join(''),
    { detail: { missing, recognised, notUsed: others } },
  )
}

function withProgress(record: StoredReplay, running: RunningReplays): ReplayRecord {
  return { ...record, progress: record.state === 'running' ? running.progress(record.id) : null }
}

function problemOf(error: unknown): { code: string; detail: string } {
  if (error instanceof InputError) return { code: error.code, detail: error.message }
  return { code: 'INTERNAL', detail: 'a fault of this program; its log says more' }
}

function notFound(id: string, expected = 'the id of a kept replay'): InputError {
  return new InputError('REPLAY_NOT_FOUND', `replay: expected ${expected}, got "${id.slice(0, 100)}"`)
}

function checkSettings(settings: ScoringSettings): void {
  const crossed = crossedSettings(settings)
  if (crossed !== null) throw new InputError('BAD_OPTION', crossed)
}
