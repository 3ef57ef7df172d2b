import { createWriteStream } from 'node:fs'
import { join } from 'node:path'
import { Readable } from 'node:stream'
import { pipeline } from 'node:stream/promises'
import { afterAll, beforeAll, expect, onTestFinished, test } from 'vitest'
import { createIntake } from '../../src/intake/index.ts'
import type { LogFile, Progress } from '../../src/replay/contract.ts'
import type { ScoreSheet, SiteFile } from '../../src/sheet/index.ts'
import { emptyAccount, logCsv, simulateFarm, siteFileOf } from '../../src/simulate/index.ts'
import { SETTINGS } from '../frame/settings.ts'
import { openCompiledScorers } from './compiled-scorers.ts'
import { LIMITS, makeFolder, openService, removeFolder, type Service } from './farm.ts'

const DAYS = 7
const OFFSET_DEG = 6
const METHOD = 'power before and after yaw moves'

let folder: string
let log: LogFile
let opened: Service
const farm = { site: {} as SiteFile, fromMs: NaN }

/** A turbine alone whose anemometer answers to the vane, which shifts any estimate by wind speed by 10 degrees. */
beforeAll(async () => {
  folder = await makeFolder()
  const simulated = simulateFarm({
    turbines: 1,
    days: DAYS,
    rateS: 1,
    seed: 31,
    offsetsDeg: [OFFSET_DEG],
    anemometerResponsePerDeg: -0.003,
  })
  farm.site = siteFileOf(simulated)
  farm.fromMs = simulated.scenario.startMs
  const path = join(folder, 'seconds.csv')
  await pipeline(Readable.from(logCsv(simulated, emptyAccount())), createWriteStream(path))
  log = { name: 'seconds.csv', path }
  opened = await openService(join(folder, 'data'))
}, 120_000)

afterAll(async () => {
  await opened.close()
  await removeFolder(folder)
})

const oneShot = (service: Service, onProgress?: (progress: Progress) => void): Promise<ScoreSheet> =>
  service.replays.oneShot({ logs: [log], site: farm.site, reading: {}, settings: SETTINGS }, onProgress)

test('a lone turbine at 1 Hz is judged by its yaw moves, whatever its anemometer answers', async () => {
  const stages: string[] = []
  const sheet = await oneShot(opened, ({ stage, share }) => {
    expect(share).toBeGreaterThanOrEqual(0)
    expect(share).toBeLessThanOrEqual(1)
    if (stages.at(-1) !== stage) stages.push(stage)
  })
  expect(stages).toEqual(['reading', 'framing', 'examining', 'scoring', 'writing'])
  const { staticOffset } = sheet.turbines[0]!
  expect(staticOffset.method).toBe(METHOD)
  expect(staticOffset.estimates.map(({ method }) => method)).toEqual([
    METHOD,
    'power against vane, own anemometer',
  ])
  const [low, high] = staticOffset.interval95GivenExponentDeg as [number, number]
  expect(low).toBeLessThan(OFFSET_DEG)
  expect(high).toBeGreaterThan(OFFSET_DEG)
  // A week: half of what a month leaves (at most 3 degrees), times the root of 30 / 7, and a margin.
  expect(high - low).toBeLessThan(2 * 3 * Math.sqrt(30 / DAYS) * 1.3)
  // The site's clock is an hour ahead: seven days of UTC touch eight of its own.
  expect(staticOffset.days).toBe(DAYS + 1)
}, 120_000)

test('a stored log in worker threads comes to the same turbines as one that was posted', async () => {
  const scorers = await openCompiledScorers(2)
  onTestFinished(() => scorers.close())
  const other = await openService(join(folder, 'other'), 'w', scorers)
  onTestFinished(() => other.close())
  const site = farm.site.site!
  await other.store.sites.put(site, farm.site)
  await createIntake({ store: other.store, limits: LIMITS, newId: () => 'b1' }).post(site, [log], {})
  const stored = await other.replays.stored({
    site,
    fromMs: farm.fromMs,
    toMs: farm.fromMs + DAYS * 86_400_000,
    settings: SETTINGS,
  })
  const posted = await oneShot(opened)
  expect(stored.turbines).toEqual(posted.turbines)
}, 120_000)

test('a replay stops while it examines', async () => {
  let cancelled: Promise<void> | undefined
  const cancel = async (): Promise<void> => {
    const [newest] = (await opened.replays.list({ limit: 1 })).replays
    expect(newest?.state).toBe('running')
    await opened.replays.remove(newest!.id)
  }
  const stopped = oneShot(opened, ({ stage, share }) => {
    if (stage === 'examining' && share > 0) cancelled ??= cancel()
  })
  await expect(stopped).rejects.toMatchObject({ code: 'INTERRUPTED' })
  await cancelled
}, 120_000)
