import { createHash } from 'node:crypto'
import { readdirSync, readFileSync } from 'node:fs'
import { mkdtemp, rm, writeFile } from 'node:fs/promises'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { gunzipSync } from 'node:zlib'
import { createReplays, openScorers, type Replays, type Scorers } from '../../src/replay/index.ts'
import type { OneShotRequest } from '../../src/replay/contract.ts'
import type { ScoreSheet, ScoringSettings, SiteFile } from '../../src/sheet/index.ts'
import { openStore, type Store } from '../../src/store/index.ts'
import { SETTINGS } from '../frame/settings.ts'

const ROOT = fileURLToPath(new URL('../../', import.meta.url))
export const DEMO_LOG = join(ROOT, 'data-demo/quern-hill-2026-03.csv.gz')
export const demoText = (): string => gunzipSync(readFileSync(DEMO_LOG)).toString('utf8')
const json = (path: string): unknown => JSON.parse(readFileSync(join(ROOT, path), 'utf8'))
export const DEMO_SITE = json('data-demo/quern-hill.site.json') as SiteFile
export const DEMO_TRUTH = json('data-demo/quern-hill.truth.json') as {
  log: { dataLines: number; rows: number; cut: number; unreadable: number; repeated: number }
  faults: { turbine: string; kind: string; from: string; to: string }[]
  turbines: {
    turbine: string
    offsetDeg: number
    yawErrorMeanDeg: number
    producedMwh: number
    lostStaticMwh: number
  }[]
}
/** Repository's neighbour with data that is not part of the project. */
export const SHARED = join(ROOT, '../shared')

export const LIMITS = {
  maxDecompressedBytes: 2 ** 30,
  maxLineBytes: 2 ** 20,
  maxColumns: 2000,
  maxRows: 10_000_000,
}

export interface Service {
  readonly store: Store
  readonly replays: Replays
  close(): Promise<void>
}

/** Real parts over a data folder; ids count up from `prefix`. */
export async function openService(
  folder: string,
  prefix = 'r',
  scorers: Scorers = openScorers(0),
): Promise<Service> {
  let count = 0
  let now = 1_775_000_000_000
  const newId = () => `${prefix}${String(++count).padStart(4, '0')}`
  const clock = () => (now += 1000)
  const store = await openStore({ folder, clock, newId, keepFreeBytes: 0 })
  const replays = createReplays({ store, limits: LIMITS, scorers, version: '0.0.0-test', clock, newId })
  return {
    store,
    replays,
    async close() {
      await replays.close()
      await scorers.close()
      await store.close()
    },
  }
}

export const makeFolder = (): Promise<string> => mkdtemp(join(tmpdir(), 'yawledger-replay-'))
export const removeFolder = (folder: string): Promise<void> => rm(folder, { recursive: true, force: true })

export async function writeLog(
  folder: string,
  name: string,
  text: string,
): Promise<{ name: string; path: string }> {
  const path = join(folder, name)
  await writeFile(path, text)
  return { name, path }
}

export function demoRequest(
  change: Partial<ScoringSettings> = {},
  rest: Partial<OneShotRequest> = {},
): OneShotRequest {
  return {
    logs: [{ name: 'quern-hill-2026-03.csv.gz', path: DEMO_LOG }],
    site: DEMO_SITE,
    reading: {},
    settings: { ...SETTINGS, ...change },
    ...rest,
  }
}

export const turbineOf = (sheet: ScoreSheet, name: string): ScoreSheet['turbines'][number] =>
  sheet.turbines.find(({ turbine }) => turbine === name)!

export const sha256 = (bytes: Buffer | string): string => createHash('sha256').update(bytes).digest('hex')

/** Every file below a folder, without the catalogue's own. */
export function filesBelow(folder: string): string[] {
  return readdirSync(folder, { recursive: true, withFileTypes: true })
    .filter((entry) => entry.isFile() && !entry.name.startsWith('catalogue.'))
    .map((entry) => entry.name)
    .sort()
}
