import { mkdir, rm } from 'node:fs/promises'
import { join } from 'node:path'
import { InputError } from '../errors.ts'
import {
  describeLog,
  stageLog,
  type LogDescription,
  type LogLimits,
  type LogReading,
  type LogSource,
} from '../log/index.ts'
import type { ReadingOptions, Receipt, SiteFile } from '../sheet/index.ts'
import { asStorageFull, type Store, type StoredBatch } from '../store/index.ts'
import { contentKey, withHashes } from './content-key.ts'
import { coverage, type Coverage, type CoverageWindow } from './coverage.ts'

/** Takes logs in and accounts for them. */
export interface Intake {
  /**
   * Reads logs that lie on disk and keeps their rows under the site, all or nothing; the files stay where they are. In
   * the store's temporary folder, or elsewhere on its disk, they need not be copied to be read.
   * The same bytes read the same way are answered with the first receipt, `isNew` false.
   * @throws InputError SITE_NOT_FOUND, LOG_*, BAD_OPTION, STORAGE_FULL
   */
  post(
    site: string,
    logs: readonly LogSource[],
    reading: ReadingOptions,
  ): Promise<{ batch: StoredBatch; isNew: boolean }>
  /**
   * Says how logs would be read, one answer a log, and keeps nothing.
   * @param file  the site file whose zone and stamp count where the reading says nothing
   * @throws InputError LOG_NOT_FOUND, LOG_CORRUPT, LOG_EMPTY
   */
  describe(logs: readonly LogSource[], reading: ReadingOptions, file?: SiteFile): Promise<LogDescription[]>
  /** @throws InputError SITE_NOT_FOUND, BATCH_NOT_FOUND */
  get(site: string, batch: string): Promise<StoredBatch>
  /** Newest first. @throws InputError SITE_NOT_FOUND, BAD_REQUEST */
  list(
    site: string,
    page: { after?: string; limit: number },
  ): Promise<{ batches: StoredBatch[]; next: string | null }>
  /** Rows that this log overruled count again. @throws InputError SITE_NOT_FOUND, BATCH_NOT_FOUND */
  remove(site: string, batch: string): Promise<void>
  /** Path of a CSV with file, line, reason, text; null when no row was rejected. @throws as `get` */
  rejectedPath(site: string, batch: string): Promise<string | null>
  /** @throws InputError SITE_NOT_FOUND, TURBINE_NOT_FOUND, BAD_REQUEST */
  coverage(site: string, turbine: string, window?: CoverageWindow): Promise<Coverage>
}

export interface IntakeParts {
  readonly store: Store
  readonly limits: LogLimits
  readonly newId: () => string
}

export function createIntake({ store, limits, newId }: IntakeParts): Intake {
  return {
    async post(site, logs, given) {
      const file = await store.sites.get(site)
      if (!file) {
        throw new InputError('SITE_NOT_FOUND', `site: expected one that was put, got "${site.slice(0, 100)}"`)
      }
      const reading = withDefaults(given, file)
      const hashed = await withHashes(logs)
      const hashes = hashed.map(({ sha256 }) => sha256)
      const names = logs.map(({ name }) => name)
      const key = contentKey(hashes, { reading })
      const namedKey = contentKey(hashes, { reading, names })
      const known = (await store.logs.find(site, key)) ?? (await store.logs.find(site, namedKey))
      if (known) return { batch: known, isNew: false }
      // A folder of its own: posts at the same time write working files of the same names.
      const folder = join(store.tempFolder, `post-${newId()}`)
      await mkdir(folder)
      try {
        const staged = await stageLog(hashed, reading, { scans: store.scans, folder, limits })
        return await store.logs.add({
          site,
          path: staged.path,
          rejectedPath: staged.rejectedPath,
          receipt: staged.receipt,
          reading: { ...reading },
          contentKey: mayNameTurbine(staged.receipt, names, reading) ? namedKey : key,
        })
      } catch (error) {
        throw asStorageFull(error)
      } finally {
        await rm(folder, { recursive: true, force: true })
      }
    },
    async describe(logs, reading, file = {}) {
      const parts = { scans: store.scans, folder: store.tempFolder, limits }
      const descriptions: LogDescription[] = []
      for (const log of logs) descriptions.push(await describeLog(log, withDefaults(reading, file), parts))
      return descriptions
    },
    get: (site, batch) => store.logs.get(site, batch),
    list: (site, page) => store.logs.list(site, page),
    remove: (site, batch) => store.logs.remove(site, batch),
    rejectedPath: (site, batch) => store.logs.rejectedPath(site, batch),
    coverage: (site, turbine, window) => coverage(store, site, turbine, window),
  }
}

/** Where the turbine is taken from the name of a file, equal bytes under another name are another turbine's. */
function mayNameTurbine(receipt: Receipt, names: readonly string[], reading: LogReading): boolean {
  if (reading.turbine !== undefined) return false
  const hasColumn = receipt.columns.some(({ takenFor }) => takenFor === 'turbine')
  return !hasColumn || names.length > 1
}

/** What the site file says about stamps counts where the request says nothing, and is part of how a log was read. */
function withDefaults(given: ReadingOptions, file: SiteFile): LogReading {
  return {
    ...given,
    ...(file.timezone === undefined ? {} : { defaultTimezone: file.timezone }),
    ...(file.stamp === undefined ? {} : { defaultStamp: file.stamp }),
  }
}
