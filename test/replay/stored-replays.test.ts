import { stat } from 'node:fs/promises'
import { buffer } from 'node:stream/consumers'
import { expect, onTestFinished, test } from 'vitest'
import { createIntake } from '../../src/intake/index.ts'
import { openScorers, type Scorers, type StoredRequest } from '../../src/replay/index.ts'
import { emptyAccount, farmScenario, logCsv, simulateFarm } from '../../src/simulate/index.ts'
import { SETTINGS } from '../frame/settings.ts'
import {
  DEMO_SITE,
  demoRequest,
  demoText,
  LIMITS,
  makeFolder,
  openService,
  removeFolder,
  writeLog,
  type Service,
} from './farm.ts'

const SITE = 'quern-hill'
const [HEADER, ...ROWS] = demoText().trimEnd().split('\n') as [string, ...string[]]
const FROM_MS = Date.UTC(2026, 2, 1)
const day = (n: number): number => FROM_MS + (n - 1) * 86_400_000

interface Opened extends Service {
  readonly folder: string
  readonly post: (name: string, text: string) => Promise<void>
}

async function service(scorers?: Scorers, given?: string): Promise<Opened> {
  const folder = given ?? (await makeFolder())
  if (given === undefined) onTestFinished(() => removeFolder(folder))
  const opened = await openService(folder, given === undefined ? 'r' : 's', scorers)
  onTestFinished(() => opened.close())
  const { store } = opened
  let batches = 0
  const intake = createIntake({ store, limits: LIMITS, newId: () => `b${++batches}` })
  await store.sites.put(SITE, DEMO_SITE)
  return {
    ...opened,
    folder,
    post: async (name, text) => {
      await intake.post(SITE, [await writeLog(folder, name, text)], {})
    },
  }
}

/** Rows of two turbines of the demo month, of days `from` up to before `to`. */
function demoRows(from: number, to: number): string {
  const rows = ROWS.filter((row) => {
    const ms = Date.parse(row.slice(0, 20))
    return /,Q0[46],/.test(row) && ms >= day(from) && ms < day(to)
  })
  return `${HEADER}\n${rows.join('\n')}\n`
}

function request(change: Partial<StoredRequest> = {}): StoredRequest {
  return { site: SITE, fromMs: day(1), toMs: day(32), settings: SETTINGS, ...change }
}

/** Scorers that hold every turbine back until the gate is opened, and count what came. */
function gatedScorers() {
  const inner = openScorers(0)
  let open = (): void => undefined
  const gate = new Promise<void>((resolve) => (open = resolve))
  const seen: string[] = []
  const scorers: Scorers = {
    ...inner,
    async score(task) {
      seen.push(task.frame.turbine)
      await gate
      return inner.score(task)
    },
  }
  return {
    scorers,
    open: () => {
      open()
    },
    seen,
  }
}

/** Slow machines get time. */
const PATIENCE = { timeout: 30_000, interval: 20 }

const coded = (code: string): unknown => expect.objectContaining({ code })

test('stored logs give the sheet that the same rows give in one log', async () => {
  const { replays, post, folder } = await service()
  await post('first.csv', demoRows(1, 12))
  await post('second.csv', demoRows(10, 32)) // two days come twice
  const stored = await replays.stored(request())
  const log = await writeLog(folder, 'whole.csv', demoRows(1, 32))
  const oneShot = await replays.oneShot(demoRequest({}, { logs: [log] }))
  expect(JSON.stringify(stored.turbines)).toBe(JSON.stringify(oneShot.turbines))
  expect(stored.window).toEqual(oneShot.window)
  expect(stored.site).toBe(SITE)
  expect((await replays.get(stored.replay)).sheet).toBe(JSON.stringify(stored))
  expect(stored.provenance.inputs.map(({ name }) => name)).toEqual(['first.csv', 'second.csv'])
  expect(stored.provenance.reading).toMatchObject({
    site: SITE,
    from: '2026-03-01T00:00:00.000Z',
    to: '2026-04-01T00:00:00.000Z',
  })
})

test('the account of a window balances: what counts, what was overruled, what was rejected', async () => {
  const { replays, post, folder } = await service()
  const oneShot = await replays.oneShot(
    demoRequest({}, { logs: [await writeLog(folder, 'whole.csv', demoRows(1, 32))] }),
  )
  await post('first.csv', demoRows(1, 12))
  await post('second.csv', demoRows(10, 32))
  const whole = await replays.stored(request())
  expect(whole.rows.received).toBe(whole.rows.accepted + whole.rows.duplicate + whole.rows.rejected)
  expect(whole.rows.accepted).toBe(oneShot.rows.accepted)
  expect(whole.turbines.reduce((sum, { rows }) => sum + rows.accepted, 0)).toBe(whole.rows.accepted)
  // Rejected lines of the two days stand in both logs; a line of the demo that comes twice is a duplicate of each.
  const [first, second] = [demoRows(1, 12), demoRows(10, 32)].map(
    (text) => text.trimEnd().split('\n').length - 1,
  )
  expect(whole.rows.received).toBe(first! + second!)

  const days = await replays.stored(request({ fromMs: day(2), toMs: day(9), turbines: ['Q06'] }))
  expect(days.turbines.map(({ turbine }) => turbine)).toEqual(['Q06'])
  expect(days.window.from).toBe('2026-03-02T00:00:00.000Z')
  expect(days.rows.accepted).toBe(days.turbines[0]!.rows.accepted)
  expect(days.rows.accepted).toBeLessThanOrEqual(7 * 144)
  expect(days.rows.accepted).toBeGreaterThan(7 * 140)
  expect(days.receipt.inputs.map(({ name }) => name)).toEqual(['first.csv'])
  expect(days.warnings.filter((text) => text.includes('in the site file, but not in the log'))).toEqual([])
})

test('a request that cannot be answered is refused by name, and nothing is listed', async () => {
  const { replays, post } = await service()
  await post('log.csv', demoRows(1, 3))
  for (const act of ['stored', 'start'] as const) {
    const ask = (change: Partial<StoredRequest>) => replays[act](request(change))
    await expect(ask({ site: 'elsewhere' })).rejects.toThrow(coded('SITE_NOT_FOUND'))
    await expect(ask({ turbines: ['Q04', 'Q99'] })).rejects.toThrow(coded('TURBINE_NOT_FOUND'))
    await expect(ask({ turbines: [] })).rejects.toThrow(coded('BAD_REQUEST'))
    await expect(ask({ fromMs: day(3), toMs: day(3) })).rejects.toThrow(coded('BAD_REQUEST'))
    await expect(ask({ fromMs: NaN })).rejects.toThrow(coded('BAD_REQUEST'))
  }
  await expect(replays.stored(request({ fromMs: day(40), toMs: day(41) }))).rejects.toThrow(
    coded('LOG_NO_ROWS'),
  )
  expect((await replays.list({ limit: 10 })).replays).toEqual([])
})

test('started replays run one after the other, tell how far they are, and end with their sheet', async () => {
  const { scorers, open, seen } = gatedScorers()
  const { replays, post } = await service(scorers)
  await post('log.csv', demoRows(1, 8))
  const first = await replays.start(request())
  const second = await replays.start(request({ turbines: ['Q06'] }))
  await expect.poll(() => seen, PATIENCE).toEqual(['Q04', 'Q06'])
  expect(await replays.get(first.id)).toMatchObject({
    state: 'running',
    sheet: null,
    progress: { stage: 'scoring', share: 0 },
  })
  expect(await replays.get(second.id)).toMatchObject({ state: 'queued', progress: null })
  open()
  await expect.poll(async () => (await replays.get(second.id)).state, PATIENCE).toBe('done')
  const done = await replays.get(first.id)
  expect(done).toMatchObject({ state: 'done', progress: null, problem: null })
  expect(JSON.parse(done.sheet!)).toMatchObject({ replay: first.id, site: SITE })
  expect(seen).toEqual(['Q04', 'Q06', 'Q06'])
})

test('a replay that fails in the background says why', async () => {
  const { replays, post } = await service()
  await post('log.csv', demoRows(1, 3))
  const { id } = await replays.start(request({ fromMs: day(40), toMs: day(41) }))
  await expect.poll(async () => (await replays.get(id)).state, PATIENCE).toBe('failed')
  expect((await replays.get(id)).problem).toMatchObject({ code: 'LOG_NO_ROWS' })
  await replays.remove(id)
  await expect(replays.get(id)).rejects.toThrow(coded('REPLAY_NOT_FOUND'))
})

test('a waiting and a running replay can be cancelled, stay to be read, and can then be removed', async () => {
  const { scorers, open, seen } = gatedScorers()
  const { replays, post, store } = await service(scorers)
  await post('log.csv', demoRows(1, 8))
  const runs = await replays.start(request())
  const waits = await replays.start(request())
  const last = await replays.start(request({ turbines: ['Q04'] }))
  await expect.poll(() => seen.length, PATIENCE).toBe(2)
  await replays.remove(waits.id)
  await replays.remove(runs.id)
  expect((await replays.get(runs.id)).state).toBe('cancelled')
  expect((await replays.get(waits.id)).state).toBe('cancelled')
  open()
  await expect.poll(async () => (await replays.get(last.id)).state, PATIENCE).toBe('done')
  expect((await replays.get(runs.id)).state).toBe('cancelled')
  expect((await replays.get(waits.id)).state).toBe('cancelled')
  expect(await store.frames.path(runs.id)).toBeUndefined()
  expect(seen).toEqual(['Q04', 'Q06', 'Q04']) // the waiting one was never begun
  await replays.remove(runs.id)
  await expect(replays.get(runs.id)).rejects.toThrow(coded('REPLAY_NOT_FOUND'))
})

test('what a stop of the service cut off has failed as interrupted after the next start; what was done stays', async () => {
  const folder = await makeFolder()
  onTestFinished(() => removeFolder(folder))
  const { scorers, open, seen } = gatedScorers()
  const first = await service(scorers, folder)
  await first.post('log.csv', demoRows(1, 8))
  const cut = await first.replays.start(request())
  const waiting = await first.replays.start(request())
  await expect.poll(() => seen.length, PATIENCE).toBe(2)
  const closing = first.close()
  await expect(first.replays.start(request())).rejects.toThrow()
  open()
  await closing
  const second = await openService(folder, 'x')
  onTestFinished(() => second.close())
  for (const { id } of [cut, waiting]) {
    expect(await second.replays.get(id)).toMatchObject({
      state: 'failed',
      problem: { code: 'INTERRUPTED' },
      progress: null,
    })
  }
})

test('stored seconds are scored as the same seconds in one log, and leave ten-minute rows behind', async () => {
  const { replays, post, folder, store } = await service()
  const farm = simulateFarm(farmScenario({ seed: 5, turbines: 1, days: 1, rateS: 1 }))
  const text = [...logCsv(farm, emptyAccount())].join('')
  await post('seconds.csv', text)
  const turbine = farm.turbines[0]!.turbine
  const site = { ...DEMO_SITE, turbines: (DEMO_SITE.turbines ?? []).filter((one) => one.turbine === turbine) }
  const fromMs = farm.scenario.startMs
  const stored = await replays.stored(request({ fromMs, toMs: fromMs + 86_400_000, turbines: [turbine] }))
  const log = await writeLog(folder, 'again.csv', text)
  const oneShot = await replays.oneShot({ logs: [log], site, reading: {}, settings: SETTINGS })
  expect(stored.window).toEqual(oneShot.window)
  expect(stored.window.intervalS).toBe(600)
  expect(stored.receipt.intervalS).toBe(1)
  expect(JSON.stringify(stored.turbines)).toBe(JSON.stringify(oneShot.turbines))
  const csv = async (id: string) => (await buffer((await replays.rows(id, 'csv')).stream)).toString()
  expect(await csv(stored.replay)).toBe(await csv(oneShot.replay))
  const sizes = [stored, oneShot].map(
    async ({ replay }) => (await stat((await store.frames.path(replay))!)).size,
  )
  const [scoredOnly, asTheyCame] = await Promise.all(sizes)
  expect(scoredOnly!).toBeLessThan(asTheyCame! / 5)
})
