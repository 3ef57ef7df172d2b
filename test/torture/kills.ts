/**
 * Kills a service at random moments while logs arrive over HTTP from several clients, and looks after each restart at what
 * the service says and at what lies in its folder.
 */
import { readdir } from 'node:fs/promises'
import { join } from 'node:path'
import { setTimeout as sleep } from 'node:timers/promises'
import { createRandom } from '../../src/kernel/stats/index.ts'
import { openStore } from '../../src/store/index.ts'
import type { Checks } from './checks.ts'
import { Ledger, SITE, type StoredLog } from './ledger.ts'
import { rowsInFiles } from './rows-in-files.ts'
import { startService, type Service } from './service.ts'
import { post, postReplay, removeOne } from './traffic.ts'

const MOST_START_S = 3
/** A service is killed so long, at most, after the posts began, or (every second time) after one was acknowledged, ms. */
const LATEST_KILL_MS = 2000
/** One in so many services is killed while it starts. */
const KILLED_AT_START = 8
/** After so many kills the service is stopped in good order, and what it leaves is looked at. */
const CLEAN_STOP_EVERY = 10

export async function kills(
  checks: Checks,
  options: { main: string; folder: string; count: number; seed: number },
): Promise<void> {
  const { folder, count } = options
  const random = createRandom(options.seed)
  const ledger = new Ledger()
  const starts: { readyS: number; waitedS: number }[] = []
  const start = async () => {
    const service = await startService(options)
    starts.push(service)
    const net = service.readyS - service.waitedS
    const worst = starts.reduce((a, b) => (a.readyS - a.waitedS > b.readyS - b.waitedS ? a : b))
    checks.expect(
      'the service starts quickly',
      net < MOST_START_S,
      `worst of ${starts.length}: ${worst.readyS.toFixed(2)} s, of which it waited ${worst.waitedS.toFixed(2)} s for a processor that others held (the rest under ${MOST_START_S} s); longest of all ${Math.max(...starts.map(({ readyS }) => readyS)).toFixed(2)} s`,
    )
    return service
  }
  let service = await start()
  await service.send('PUT', `/v1/sites/${SITE}`, JSON.stringify({ timezone: 'UTC', stamp: 'begin' }))
  for (let kill = 1; kill <= count; kill++) {
    if (random.below(KILLED_AT_START) === 0) {
      await service.kill()
      const starting = await startService({ ...options, killAfterMs: random.below(1500) })
      await starting.kill()
    } else {
      const momentMs = random.below(LATEST_KILL_MS)
      const stopped = { is: false }
      const clients = traffic(service, ledger, stopped, kill).finally(() => (stopped.is = true))
      const before = ledger.acknowledgements
      const waitsForAnswer = random.below(2) === 0
      while (waitsForAnswer && ledger.acknowledgements === before && !stopped.is) await sleep(5)
      await sleep(momentMs)
      stopped.is = true
      await service.kill()
      await clients
    }
    service = await start()
    await lookAround(checks, service, ledger, folder)
    if (kill % CLEAN_STOP_EVERY === 0 || kill === count) {
      await service.stop()
      await lookAtRest(checks, ledger, folder)
      checks.note(`${kill} kills: ${ledger.describe()}`)
      service = await start()
      await lookAround(checks, service, ledger, folder)
    }
  }
  await service.stop()
}

/** Several clients that send one thing after another until the connection breaks. */
async function traffic(
  service: Service,
  ledger: Ledger,
  stopped: { readonly is: boolean },
  seed: number,
): Promise<void> {
  const client = async (stream: number, act: (random: ReturnType<typeof createRandom>) => Promise<void>) => {
    const random = createRandom(seed, stream)
    try {
      while (!stopped.is) await act(random)
    } catch (error) {
      if (!isBrokenOff(error)) throw error
    }
  }
  await Promise.all([
    client(1, (random) => post(service, ledger, random, 4 + random.below(30))),
    client(2, (random) => post(service, ledger, random, 4 + random.below(300))),
    client(3, (random) => post(service, ledger, random, 1000 + random.below(3000))),
    client(4, (random) => postReplay(service, ledger, random)),
    client(5, (random) => removeOne(service, ledger, random)),
  ])
}

function isBrokenOff(error: unknown): boolean {
  const code = error instanceof Error ? (error as NodeJS.ErrnoException).code : undefined
  return code === 'ECONNRESET' || code === 'ECONNREFUSED' || code === 'EPIPE'
}

/** What a service that has just started says, and what lies in its folder before anything else is posted. */
async function lookAround(checks: Checks, service: Service, ledger: Ledger, folder: string): Promise<void> {
  const listed = await listAll<StoredLog>(service, `/v1/sites/${SITE}/logs?limit=200`, 'logs')
  // What was cut off is there whole or not at all; from here on it must stay as it was found.
  for (const problem of ledger.settle(listed))
    checks.expect('what was cut off is whole or absent', false, problem)
  checks.expect('what was cut off is whole or absent', true, ledger.describe())
  const differing = ledger.differing(listed)
  checks.expect(
    'acknowledged logs and their receipts',
    differing.length === 0,
    differing.slice(0, 3).join('; ') || ledger.describe(),
  )

  for (const turbine of ledger.turbines()) {
    const answer = await service.send('GET', `/v1/sites/${SITE}/turbines/${turbine}/coverage`)
    const { days } = JSON.parse(answer.body) as { days: { rows: number }[] }
    const got = days.reduce((sum, { rows }) => sum + rows, 0)
    const expected = ledger.coveredMinutes()
    checks.expect(
      'coverage counts the rows of whole logs',
      got === expected,
      `${turbine}: ${got} of ${expected}`,
    )
  }
  const segments = (await readdir(join(folder, 'segments'))).map((name) => join(folder, 'segments', name))
  const rows = await rowsInFiles(segments, ledger.known())
  const wrong = ledger.wrongRows(rows, { countsOverruled: true })
  checks.expect(
    'segment files hold every row once, with its values',
    wrong.length === 0,
    wrong.slice(0, 3).join('; ') || `${segments.length} files`,
  )

  const replays = await listAll<{ id?: string; replay?: string; state: string }>(
    service,
    '/v1/replays?limit=200',
    'replays',
  )
  const done = replays.filter(({ state }) => state === 'done').map(idOf)
  const open = replays.filter(({ state }) => state !== 'done' && state !== 'failed').map(idOf)
  checks.expect('no replay is left open', open.length === 0, `${open.length} of ${replays.length}`)
  for (const [id, sheet] of ledger.sheets) {
    const { body } = await service.send('GET', `/v1/replays/${id}`)
    checks.expect('acknowledged score sheets, byte for byte', body === sheet, `${ledger.sheets.size} sheets`)
  }
  for (const id of ledger.sheets.keys())
    if (!done.includes(id))
      checks.expect('acknowledged score sheets, byte for byte', false, `${id} is not listed as done`)

  const expected = {
    temp: [],
    'duck-temp': [],
    frames: done.map((id) => `${id}.parquet`),
    rejected: ledger.rejectedFiles(),
  }
  await compareFolders(checks, folder, expected)
}

const idOf = ({ id, replay }: { id?: string; replay?: string }): string => id ?? replay ?? ''

async function compareFolders(
  checks: Checks,
  folder: string,
  expected: Record<string, readonly string[]>,
): Promise<void> {
  for (const [name, files] of Object.entries(expected)) {
    const found = await readdir(join(folder, name))
    const stray = found.filter((file) => !files.includes(file))
    const missing = files.filter((file) => !found.includes(file))
    checks.expect(
      'no file in the folder is stray or missing',
      stray.length + missing.length === 0,
      `${name}: stray ${stray.join(' ') || 'none'}, missing ${missing.join(' ') || 'none'}`,
    )
  }
}

/** What a service that was stopped in good order leaves: the catalogue against the files, and the rows that count. */
async function lookAtRest(checks: Checks, ledger: Ledger, folder: string): Promise<void> {
  const top = (await readdir(folder)).sort().join(' ')
  const expected = 'catalogue.duckdb duck-temp frames rejected segments temp'
  checks.expect('no file in the folder is stray or missing', top === expected, `top: ${top}`)
  await compareFolders(checks, folder, { temp: [], 'duck-temp': [], rejected: ledger.rejectedFiles() })
  const before = await readdir(join(folder, 'segments'))
  const store = await openStore({ folder, clock: Date.now, newId: () => `look-${Date.now()}` })
  try {
    // Opening removes what the catalogue does not name; `verify` names what it misses.
    const after = await readdir(join(folder, 'segments'))
    checks.expect(
      'the catalogue names every segment file',
      before.length === after.length,
      `${after.length} files`,
    )
    const damaged = await store.logs.verify()
    checks.expect(
      'checksums of the segment files',
      damaged.length === 0,
      damaged.join(' ') || `${after.length} files`,
    )
    const { path } = await store.logs.readWindow(SITE)
    const rows = await rowsInFiles(path === null ? [] : [path], ledger.known())
    const wrong = ledger.wrongRows(rows, { countsOverruled: false })
    checks.expect(
      'the rows that count, with their values',
      wrong.length === 0,
      wrong.slice(0, 3).join('; ') || `${rows.reduce((sum, { rows: one }) => sum + one, 0)} rows`,
    )
  } finally {
    await store.close()
  }
}

async function listAll<T>(service: Service, address: string, key: string): Promise<T[]> {
  const all: T[] = []
  let after = ''
  for (;;) {
    const { status, body } = await service.send('GET', `${address}${after}`)
    if (status !== 200) throw new Error(`${address}: expected 200, got ${status} ${body.slice(0, 300)}`)
    const page = JSON.parse(body) as Record<string, unknown>
    all.push(...(page[key] as T[]))
    if (typeof page['next'] !== 'string') return all
    after = `&after=${encodeURIComponent(page['next'])}`
  }
}
