/**
 * Ten thousand small logs posted to one site, merged in the background, against the same rows posted as one log: how long a
 * month takes to read, how many files there are, how long the service takes to start. The posts go through the intake and
 * the store in this process; the start is that of the service itself.
 */
import { readdir, rm, writeFile } from 'node:fs/promises'
import { join } from 'node:path'
import { createIntake, type Intake } from '../../src/intake/index.ts'
import { DEFAULT_LIMITS } from '../../src/log/index.ts'
import { openStore, type Store } from '../../src/store/index.ts'
import type { Checks } from './checks.ts'
import { startService, type Service } from './service.ts'

const MARCH = Date.UTC(2026, 2, 1)
const TURBINES = ['Q01', 'Q02', 'Q03', 'Q04', 'Q05']
const MINUTES_PER_POST = 4
/** Each runs queries on the thread pool of this process, which has four threads. */
const AT_ONCE = 2
/** Segments of one size step that are not merged yet are at most 15; from 16 to a million rows there are five steps. */
const MOST_FILES = 15 * 5
const MOST_RATIO = 3
const MOST_START_S = 3

export async function posts(
  checks: Checks,
  options: { main: string; folder: string; count: number },
): Promise<void> {
  const { count } = options
  const reports: unknown[] = []
  let id = 0
  const newId = () => `p${++id}`
  const store = await openStore({
    folder: options.folder,
    scanMemoryMb: 512,
    clock: Date.now,
    newId,
    report: (error) => reports.push(error),
  })
  let startMs = performance.now()
  try {
    const intake = createIntake({ store, limits: DEFAULT_LIMITS, newId })
    for (const site of ['many', 'one']) await store.sites.put(site, {})
    let next = 0
    const client = async () => {
      while (next < count) {
        const n = next++
        await post(intake, store, 'many', n * MINUTES_PER_POST, (n + 1) * MINUTES_PER_POST)
        if ((n + 1) % 500 === 0) {
          const perPostMs = (performance.now() - startMs) / 500
          startMs = performance.now()
          checks.note(`${n + 1} posts, the last 500 in ${perPostMs.toFixed(0)} ms each`)
        }
      }
    }
    await Promise.all(Array.from({ length: AT_ONCE }, client))
    await store.logs.compact()
    await post(intake, store, 'one', 0, count * MINUTES_PER_POST)
    await compareReads(checks, store, count)
  } finally {
    await store.close()
  }
  checks.expect('nothing failed in the background', reports.length === 0, reports.map(String).join('; '))
  const files = await readdir(join(options.folder, 'segments'))
  checks.expect(
    `${count} posts lie in few files`,
    files.length <= MOST_FILES + 1,
    `${files.length} files (at most ${MOST_FILES + 1})`,
  )
  const starts: Service[] = []
  for (let i = 0; i < 3; i++) {
    const service = await startService(options)
    starts.push(service)
    await service.stop()
  }
  const worst = Math.max(...starts.map(({ readyS, waitedS }) => readyS - waitedS))
  const longest = Math.max(...starts.map(({ readyS }) => readyS))
  checks.expect(
    'the service starts quickly',
    worst < MOST_START_S,
    `worst of 3: ${worst.toFixed(2)} s without waiting for a processor that others held (under ${MOST_START_S}); longest of all ${longest.toFixed(2)} s`,
  )
}

async function post(
  intake: Intake,
  store: Store,
  site: string,
  fromMinute: number,
  toMinute: number,
): Promise<void> {
  const lines = ['time,turbine,wind_speed,vane,nacelle_position,power']
  for (let minute = fromMinute; minute < toMinute; minute++) {
    const time = new Date(MARCH + minute * 60_000).toISOString()
    for (const [k, turbine] of TURBINES.entries()) {
      const wind = 4 + ((minute * 7 + k) % 97) / 10
      const vane = ((minute * 13 + k) % 201) / 10 - 10
      lines.push(
        `${time},${turbine},${wind},${vane.toFixed(1)},${minute % 360},${Math.round(1.9 * wind ** 3)}`,
      )
    }
  }
  const name = `${site}-${fromMinute}.csv`
  const path = join(store.tempFolder, name)
  await writeFile(path, `${lines.join('\n')}\n`)
  try {
    const { batch } = await intake.post(site, [{ name, path }], {})
    const expected = lines.length - 1
    if (batch.receipt.accepted !== expected) {
      throw new Error(`receipt: expected ${expected} rows accepted, got ${batch.receipt.accepted}`)
    }
  } finally {
    await rm(path)
  }
}

/** Reads in turn, so that other work on the machine slows both; medians. */
async function compareReads(checks: Checks, store: Store, count: number): Promise<void> {
  const window = { fromMs: MARCH, toMs: MARCH + 31 * 86_400_000 }
  const rows = Math.min(count * MINUTES_PER_POST, 31 * 1440) * TURBINES.length
  const seconds: Record<string, number[]> = { many: [], one: [] }
  const sums: Record<string, string> = {}
  for (let round = 0; round < 7; round++) {
    for (const site of ['many', 'one']) {
      const startMs = performance.now()
      const read = await store.logs.readWindow(site, window)
      seconds[site]!.push((performance.now() - startMs) / 1000)
      if (read.rows !== rows) throw new Error(`${site}: expected ${rows} rows, got ${read.rows}`)
      await rm(read.path!)
    }
  }
  for (const site of ['many', 'one']) {
    const read = await store.logs.rows(site, window)
    sums[site] = JSON.stringify(
      read.map(({ turbine, time, numbers }) => [
        turbine,
        sum(time),
        Object.entries(numbers)
          .map(([name, values]) => [name, sum(values)])
          .sort(),
      ]),
    )
  }
  checks.expect('many small logs answer as one', sums['many'] === sums['one'], `${rows} rows`)
  const [many, one] = [median(seconds['many']!), median(seconds['one']!)]
  checks.expect(
    'a month of many small logs is read as fast as one log',
    many / one <= MOST_RATIO,
    `${many.toFixed(3)} s against ${one.toFixed(3)} s: ${(many / one).toFixed(2)} x (at most ${MOST_RATIO})`,
  )
}

const sum = (values: Float64Array) => values.reduce((total, value, i) => total + value * (1 + (i % 7)), 0)
const median = (values: readonly number[]) => [...values].sort((a, b) => a - b)[values.length >> 1]!
