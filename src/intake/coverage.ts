import { InputError } from '../errors.ts'
import type { Store } from '../store/index.ts'

export interface CoverageDay {
  /** YYYY-MM-DD, UTC. */
  readonly day: string
  /** Rows that count; a time posted twice is one. */
  readonly rows: number
  /** Rows of a full day at the site's interval, within the window; null when the interval is not known. */
  readonly expected: number | null
  /** First and last time of the day, ISO 8601; null on a day without rows. */
  readonly first: string | null
  readonly last: string | null
}

export interface Coverage {
  readonly site: string
  readonly turbine: string
  /** Seconds; null when neither the site file nor a receipt gives it. */
  readonly intervalS: number | null
  /** Every day from the first to the last one, also those without rows. */
  readonly days: readonly CoverageDay[]
}

export interface CoverageWindow {
  /** Epoch ms, inclusive; default: the turbine's first row. */
  readonly fromMs?: number
  /** Epoch ms, exclusive; default: just after the turbine's last row. */
  readonly toMs?: number
}

const DAY_MS = 86_400_000
/** Twenty years and a bit: a stray stamp in 1970 shall not make an answer of tens of thousands of days. */
const MAX_DAYS = 7_500

/**
 * What is there of a turbine, and what is missing, day by day (UTC).
 * @throws InputError SITE_NOT_FOUND, TURBINE_NOT_FOUND, BAD_REQUEST for a window that is empty or too long
 */
export async function coverage(
  store: Store,
  site: string,
  turbine: string,
  window: CoverageWindow = {},
): Promise<Coverage> {
  const extents = await store.logs.extents(site)
  const extent = extents.find((one) => one.turbine === turbine)
  const file = await store.sites.get(site)
  if (!extent && !file?.turbines?.some((one) => one.turbine === turbine)) {
    throw new InputError(
      'TURBINE_NOT_FOUND',
      `turbine: expected one of site "${site}", got "${turbine.slice(0, 100)}"`,
    )
  }
  const intervalS = file?.intervalS ?? (await lastIntervalS(store, site))
  const fromMs = window.fromMs ?? extent?.firstMs
  const toMs = window.toMs ?? (extent && extent.lastMs + 1)
  if (fromMs === undefined || toMs === undefined) return { site, turbine, intervalS, days: [] }
  checkWindow(fromMs, toMs, window)
  const found = await store.logs.days(site, turbine, { fromMs, toMs })
  const byDay = new Map(found.map((day) => [day.dayMs, day]))
  // Without a window the first and the last day count as whole ones: what is missing of them is missing.
  const dayFromMs = Math.floor(fromMs / DAY_MS) * DAY_MS
  const days: CoverageDay[] = []
  for (let dayMs = dayFromMs; dayMs < toMs; dayMs += DAY_MS) {
    const day = byDay.get(dayMs)
    const startMs = window.fromMs === undefined ? dayMs : Math.max(dayMs, fromMs)
    const endMs = window.toMs === undefined ? dayMs + DAY_MS : Math.min(dayMs + DAY_MS, toMs)
    days.push({
      day: new Date(dayMs).toISOString().slice(0, 10),
      rows: day?.rows ?? 0,
      expected: intervalS === null ? null : Math.round((endMs - startMs) / (intervalS * 1000)),
      first: day ? new Date(day.firstMs).toISOString() : null,
      last: day ? new Date(day.lastMs).toISOString() : null,
    })
  }
  return { site, turbine, intervalS, days }
}

function checkWindow(fromMs: number, toMs: number, given: CoverageWindow): void {
  const iso = (ms: number) => (Math.abs(ms) <= 8.64e15 ? new Date(ms).toISOString() : String(ms))
  if (!(fromMs < toMs)) {
    // The turbine's rows lie wholly outside of an open window: an honest question with nothing in it is not a mistake,
    // but a window that ends before it starts is one.
    if (given.fromMs === undefined || given.toMs === undefined) return
    throw new InputError('BAD_REQUEST', `to: expected a time after ${iso(fromMs)}, got ${iso(toMs)}`)
  }
  if (!((toMs - fromMs) / DAY_MS <= MAX_DAYS)) {
    throw new InputError(
      'BAD_REQUEST',
      `from, to: expected a window of at most ${MAX_DAYS} days, got ${iso(fromMs)} to ${iso(toMs)}; name a shorter one`,
    )
  }
}

/** The interval of the newest log that shows one. */
async function lastIntervalS(store: Store, site: string): Promise<number | null> {
  const { batches } = await store.logs.list(site, { limit: 50 })
  return batches.find(({ receipt }) => receipt.intervalS !== null)?.receipt.intervalS ?? null
}
