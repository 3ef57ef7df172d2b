import { InputError } from '../errors.ts'
import type { Receipt, SiteFile } from '../sheet/index.ts'
import { countRows, type Store } from '../store/index.ts'
import type { StoredRequest } from './contract.ts'
import { windowReceipt } from './window-receipt.ts'

/** Rows of a window of stored logs, in a file, and their account. */
export interface StoredWindow {
  readonly path: string
  readonly channels: readonly string[]
  readonly receipt: Receipt
  readonly loggedIntervalsS: readonly (number | null)[]
  readonly site: SiteFile
  /** What was asked for, for the provenance. */
  readonly reading: Record<string, unknown>
}

/** @throws InputError SITE_NOT_FOUND, TURBINE_NOT_FOUND, BAD_REQUEST when the request cannot be answered at all */
export async function checkStored(store: Store, request: StoredRequest): Promise<SiteFile> {
  const { site, fromMs, toMs, turbines } = request
  const file = await store.sites.get(site)
  if (!file) {
    throw new InputError('SITE_NOT_FOUND', `site: expected one that was put, got "${site.slice(0, 100)}"`)
  }
  if (!(isMoment(fromMs) && isMoment(toMs) && fromMs < toMs)) {
    throw new InputError(
      'BAD_REQUEST',
      `from, to: expected two times, the first before the second, got ${isoTime(fromMs)} and ${isoTime(toMs)}`,
    )
  }
  if (!turbines) return file
  if (turbines.length === 0) {
    throw new InputError(
      'BAD_REQUEST',
      'turbines: expected at least one, got an empty list; leave it out for all',
    )
  }
  const known = new Set((file.turbines ?? []).map(({ turbine }) => turbine))
  for (const { turbine } of await store.logs.extents(site)) known.add(turbine)
  const unknown = turbines.find((turbine) => !known.has(turbine))
  if (unknown !== undefined) {
    throw new InputError(
      'TURBINE_NOT_FOUND',
      `turbines: expected turbines of site "${site}", got "${unknown.slice(0, 100)}"`,
    )
  }
  return file
}

/**
 * @param folder  where the file is written
 * @throws InputError as `checkStored`; LOG_NO_ROWS when the window holds none, STORAGE_FULL
 */
export async function readStored(
  store: Store,
  request: StoredRequest,
  folder: string,
): Promise<StoredWindow> {
  const file = await checkStored(store, request)
  const { site, fromMs, toMs, turbines } = request
  const window = await store.logs.readWindow(site, {
    fromMs,
    toMs,
    folder,
    ...(turbines ? { turbines } : {}),
  })
  const asked = { site, from: isoTime(fromMs), to: isoTime(toMs), turbines: turbines ?? null }
  if (window.path === null) {
    throw new InputError(
      'LOG_NO_ROWS',
      `window: expected rows of site "${site}"${turbines ? ` and turbines ${turbines.slice(0, 20).join(', ')}` : ''} from ${asked.from} to ${asked.to}, got none`,
    )
  }
  const receipts = window.batches.map(({ receipt }) => receipt)
  const wanted = turbines && new Set(turbines)
  return {
    path: window.path,
    channels: window.channels,
    receipt: windowReceipt(receipts, await countRows(store.scans, window.path), window.overruled),
    loggedIntervalsS: receipts.map(({ intervalS }) => intervalS),
    // Turbines that were not asked for are not missing.
    site: wanted
      ? { ...file, turbines: (file.turbines ?? []).filter(({ turbine }) => wanted.has(turbine)) }
      : file,
    reading: { ...asked, logs: window.batches.map(({ batch, reading }) => ({ log: batch, ...reading })) },
  }
}

function isMoment(ms: number): boolean {
  return Math.abs(ms) <= 8.64e15
}

function isoTime(ms: number): string {
  return isMoment(ms) ? new Date(ms).toISOString() : String(ms)
}
