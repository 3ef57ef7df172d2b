import { constants } from 'node:fs'
import { access, mkdir, readdir, rm } from 'node:fs/promises'
import { join, resolve } from 'node:path'
import { InputError } from '../errors.ts'
import { openScans, type Scans } from '../duck/index.ts'
import { openDuckdbDriver } from './catalogue/duckdb-driver.ts'
import { frameStore, removeOrphanFrames, type FrameStore } from './frames.ts'
import { failInterrupted, replayStore, type ReplayStore } from './replays.ts'
import { DEFAULT_COMPACTION, type CompactionLimits } from './logs/compaction.ts'
import { logStore, type LogStore } from './logs/log-store.ts'
import { removeOrphans } from './logs/segment-files.ts'
import { siteStore, type SiteStore } from './sites.ts'
import { openSpace, type SpaceLimits } from './space.ts'

export interface StoreOptions extends SpaceLimits {
  /** The data folder; made when absent. */
  readonly folder: string
  /** Memory of the catalogue, MB. Default 128. */
  readonly catalogueMemoryMb?: number
  /** Memory of scans over log files, MB; beyond it sorts spill to the data folder. Default 256. */
  readonly scanMemoryMb?: number
  /** Default 2. */
  readonly scanThreads?: number
  readonly compaction?: CompactionLimits
  /** Told what went wrong in the background: a merge that failed, a file that cannot be removed. Default: nobody. */
  readonly report?: (error: unknown) => void
  /** Epoch milliseconds. */
  readonly clock: () => number
  /** A new id that was never given before: 1 to 100 of A-Z a-z 0-9 _ -. */
  readonly newId: () => string
}

export interface Store {
  readonly replays: ReplayStore
  readonly frames: FrameStore
  readonly sites: SiteStore
  readonly logs: LogStore
  /** In-memory instance for scans; reads and writes files of the data folder only. */
  readonly scans: Scans
  /** Folder for files on their way into the store; on the same disk, emptied at start. */
  readonly tempFolder: string
  /** Asks the catalogue a question. @throws InputError NOT_READY when it does not answer */
  ready(): Promise<void>
  /** Waits for what is being written and lets go of the data folder. */
  close(): Promise<void>
}

/**
 * Opens the data folder for this process alone and clears what a crash left behind.
 *
 * @throws InputError NOT_READY when another process uses the folder; BAD_CONFIG when it cannot be written or belongs
 *   to a newer version of this program
 */
export async function openStore(options: StoreOptions): Promise<Store> {
  const { clock } = options
  const folder = resolve(options.folder)
  const tempFolder = join(folder, 'temp')
  const duckTempFolder = join(folder, 'duck-temp')
  const framesFolder = join(folder, 'frames')
  const segmentsFolder = join(folder, 'segments')
  const rejectedFolder = join(folder, 'rejected')
  await makeFolders([folder, tempFolder, duckTempFolder, framesFolder, segmentsFolder, rejectedFolder])
  // Whoever holds the catalogue owns the folder: nothing in it is touched before.
  const driver = await openDuckdbDriver(join(folder, 'catalogue.duckdb'), {
    bounds: {
      memoryMb: options.catalogueMemoryMb ?? 128,
      threads: 1,
      tempFolder: duckTempFolder,
      allowedFolders: [folder],
    },
    clock,
  })
  try {
    await emptyFolder(tempFolder)
    await emptyFolder(duckTempFolder)
    await failInterrupted(driver, clock())
    await removeOrphanFrames(driver, framesFolder)
    await removeOrphans(driver, { segments: segmentsFolder, rejected: rejectedFolder })
    const space = await openSpace(folder, [framesFolder, segmentsFolder, rejectedFolder], options)
    const scans = await openScans({
      folder,
      memoryMb: options.scanMemoryMb ?? 256,
      threads: options.scanThreads ?? 2,
    })
    const logs = logStore(driver, {
      scans,
      space,
      segmentsFolder,
      rejectedFolder,
      tempFolder,
      newId: options.newId,
      clock,
      compaction: options.compaction ?? DEFAULT_COMPACTION,
      report: options.report ?? (() => undefined),
    })
    return {
      replays: replayStore(driver, clock),
      frames: frameStore(driver, space, { folder: framesFolder, clock }),
      sites: siteStore(driver, clock),
      logs,
      scans,
      tempFolder,
      async ready() {
        try {
          await driver.query('SELECT max(version) AS version FROM schema_versions')
        } catch (error) {
          throw new InputError('NOT_READY', 'catalogue: expected an answer, got none', { cause: error })
        }
      },
      async close() {
        await logs.close()
        await driver.close()
        await scans.close()
      },
    }
  } catch (error) {
    await driver.close()
    throw error
  }
}

async function makeFolders(folders: readonly string[]): Promise<void> {
  for (const folder of folders) {
    try {
      await mkdir(folder, { recursive: true })
      await access(folder, constants.R_OK | constants.W_OK | constants.X_OK)
    } catch (error) {
      throw new InputError(
        'BAD_CONFIG',
        `data folder: expected a folder that can be written, got ${folder}`,
        {
          cause: error,
        },
      )
    }
  }
}

async function emptyFolder(folder: string): Promise<void> {
  for (const name of await readdir(folder)) await rm(join(folder, name), { recursive: true, force: true })
}
