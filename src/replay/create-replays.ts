import { mkdir, rm } from 'node:fs/promises'
import { join } from 'node:path'
import { InputError } from '../errors.ts'
import { stageLog, type LogLimits, type StagedLog } from '../log/index.ts'
import { readRows, type Store } from '../store/index.ts'
import type { OneShotRequest, Progress, ReplayRecord, Replays } from './contract.ts'
import { scoreFarm } from './score-farm.ts'
import type { Scorers } from './scorers.ts'

export interface ReplayParts {
  readonly store: Store
  readonly limits: LogLimits
  readonly scorers: Scorers
  /** Of this program, for the provenance. */
  readonly version: string
  readonly clock: () => number
  readonly newId: () => string
}

/** Runs replays over the given store and keeps their sheets and frames in it. */
export function createReplays(parts: ReplayParts): Replays {
  const { store } = parts

  const oneShot = async (
    request: OneShotRequest,
    onProgress: (progress: Progress) => void = () => undefined,
  ) => {
    const id = parts.newId()
    // A folder of its own: the log reader's working files have fixed names, and replays run side by side.
    const folder = join(store.tempFolder, `replay-${id}`)
    await mkdir(folder)
    try {
      const staged = await stage(parts, folder, request, onProgress)
      await store.replays.begin({ id, site: request.site.site ?? null, createdMs: parts.clock() })
      checkChannels(staged)
      const farm = await readRows(store.scans, staged.path)
      onProgress({ stage: 'scoring', share: 0 })
      const sheet = await scoreFarm(
        farm,
        {
          replay: id,
          version: parts.version,
          site: request.site,
          settings: request.settings,
          ratedPowerKw: request.ratedPowerKw,
          receipt: staged.receipt,
          reading: { ...request.reading },
        },
        parts.scorers,
        (done, of) => {
          onProgress({ stage: 'scoring', share: done / of })
        },
      )
      onProgress({ stage: 'writing', share: 0 })
      await store.frames.keep(id, staged.path)
      await store.replays.finish(id, JSON.stringify(sheet), parts.clock())
      return sheet
    } catch (error) {
      await store.frames.remove(id)
      await store.replays.remove(id) // the caller has the error in hand; a replay that never was is not listed
      throw error
    } finally {
      await rm(folder, { recursive: true, force: true })
    }
  }

  return {
    oneShot,
    async get(id): Promise<ReplayRecord> {
      const record = await store.replays.get(id)
      if (!record) throw notFound(id)
      return record
    },
    list: (page) => store.replays.list({ ...page, sheets: false }),
    async remove(id) {
      await store.frames.remove(id)
      if (!(await store.replays.remove(id))) throw notFound(id)
    },
  }
}

async function stage(
  parts: ReplayParts,
  folder: string,
  request: OneShotRequest,
  onProgress: (progress: Progress) => void,
): Promise<StagedLog> {
  onProgress({ stage: 'reading', share: 0 })
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

/** The offset needs these; anything else in the log is welcome but not needed. */
function checkChannels({ channels, receipt }: StagedLog): void {
  const missing = ['wind_speed', 'vane', 'power'].filter((channel) => !channels.includes(channel))
  if (missing.length === 0) return
  const recognised = receipt.columns
    .filter(({ takenFor }) => takenFor !== null)
    .map(({ column, takenFor }) => (column === takenFor ? column : `${column} (as ${takenFor ?? ''})`))
  const others = receipt.columns.filter(({ takenFor }) => takenFor === null).map(({ column }) => column)
  throw new InputError(
    'LOG_COLUMNS_MISSING',
    `log: expected columns for ${missing.join(', ')}; recognised ${recognised.join(', ') || 'nothing'}; ` +
      `not used ${others.join(', ') || 'nothing'}. Name them in columns, such as {"${missing[0]!}":"..."}`,
    { detail: { missing, recognised, notUsed: others } },
  )
}

function notFound(id: string): InputError {
  return new InputError(
    'REPLAY_NOT_FOUND',
    `replay: expected the id of a kept replay, got "${id.slice(0, 100)}"`,
  )
}
