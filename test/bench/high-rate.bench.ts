/**
 * A month of 1 Hz rows of one turbine (2,592,000 rows) looked at row by row: read from Parquet a day at a time, brought to the
 * frame's conventions and examined on this thread, against sorting a Float64Array of 1,000,000 in the same run. Targets: a
 * day in 1 s, the month in 10 s.
 */
import { setMaxListeners } from 'node:events'
import { mkdtemp, rm } from 'node:fs/promises'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import {
  DAY_MARGIN_MS,
  DAY_MS,
  examineDay,
  HIGH_RATE_CHANNELS,
  highRateRows,
} from '../../src/analysis/index.ts'
import { buildFrame } from '../../src/frame/index.ts'
import { examineHighRate } from '../../src/replay/examine-high-rate.ts'
import { openScorers } from '../../src/replay/index.ts'
import { ROW_COLUMNS, simulateFarm } from '../../src/simulate/index.ts'
import { openHighRate, openStore, reduceRows } from '../../src/store/index.ts'
import { writeParquetTable } from '../../src/replay/table-files.ts'
import { STUDY_SETTINGS } from '../study/simulated-farms.ts'

const DAYS = 30
/** Days that are simulated; the others repeat them. */
const SIMULATED_DAYS = 3
const ROUNDS = 5

export async function benchHighRate(print: (text: string) => void): Promise<void> {
  const folder = await mkdtemp(join(tmpdir(), 'yawledger-bench-'))
  let ids = 0
  const store = await openStore({ folder, clock: Date.now, newId: () => `id${++ids}`, keepFreeBytes: 0 })
  const scorers = openScorers(0)
  const { signal } = new AbortController()
  setMaxListeners(0, signal) // one for every day that waits, as in a replay
  try {
    const path = join(folder, 'temp', 'month.parquet')
    const startMs = await writeMonth(store, path)
    const [columns] = await reduceRows(store.scans, path, 1)
    const frame = buildFrame([columns!], { site: {}, settings: STUDY_SETTINGS, intervalS: 600 })
    const turbine = frame.turbines[0]!
    const source = await openHighRate(store.scans, path)
    const numbers = Float64Array.from({ length: 1_000_000 }, (_, i) => (i * 7919) % 1_000_003)
    const sort = (): number => numbers.slice().sort()[0]!
    const days: number[] = []
    const months: number[] = []
    const sorts: number[] = []
    for (let round = 0; round < ROUNDS; round++) {
      const dayMs = startMs + (round + 1) * DAY_MS
      const span = await source.read(
        turbine.turbine,
        HIGH_RATE_CHANNELS.filter((name) => source.numbers.includes(name)),
        { fromMs: dayMs - DAY_MARGIN_MS, toMs: dayMs + DAY_MS + DAY_MARGIN_MS },
      )
      days.push(await secondsOf(() => examineDay(highRateRows(turbine, dayMs, span))))
      months.push(
        await secondsOf(() => examineHighRate({ store, scorers }, path, [turbine], signal, () => undefined)),
      )
      sorts.push(await secondsOf(sort))
    }
    const reference = median(sorts)
    print(
      `examining a day of 1 Hz rows: median ${median(days).toFixed(3)} s of CPU time (at most 1), ` +
        `${(median(days) / reference).toFixed(2)} x sorting a million numbers`,
    )
    print(
      `reading and examining ${DAYS} days of them: median ${median(months).toFixed(2)} s of CPU time (at most 10), ` +
        `${(median(months) / reference).toFixed(1)} x sorting a million numbers; ` +
        `${(process.memoryUsage().rss / 1e6).toFixed(0)} MB held at the end`,
    )
  } finally {
    await scorers.close()
    await store.close()
    await rm(folder, { recursive: true, force: true })
  }
}

/** Simulated days over and over, so that making them does not take longer than looking at them. Returns the first moment. */
async function writeMonth(store: Awaited<ReturnType<typeof openStore>>, path: string): Promise<number> {
  const { scenario, turbines } = simulateFarm({ turbines: 1, days: SIMULATED_DAYS, rateS: 1, seed: 9 })
  const { timeMs, columns, turbine } = turbines[0]!
  const names = ROW_COLUMNS.filter((name) => columns[name].some((value) => !Number.isNaN(value)))
  const parts = Array.from({ length: DAYS / SIMULATED_DAYS }, (_, k) => ({
    rows: timeMs.length,
    columns: {
      ...columns,
      time: timeMs.map((ms) => ms + k * SIMULATED_DAYS * DAY_MS),
      turbine: Array.from(timeMs, () => turbine),
    },
  }))
  await writeParquetTable(
    store.scans,
    path,
    {
      turbine: 'text',
      time: 'integer',
      ...Object.fromEntries(names.map((name) => [name, 'number' as const])),
    },
    parts,
  )
  return scenario.startMs
}

/** CPU time of all threads, which other work on the machine does not lengthen. */
async function secondsOf(work: () => unknown): Promise<number> {
  const start = process.cpuUsage()
  await work()
  const { user, system } = process.cpuUsage(start)
  return (user + system) / 1e6
}

function median(values: readonly number[]): number {
  return [...values].sort((a, b) => a - b)[values.length >> 1]!
}
