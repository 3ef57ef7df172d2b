#!/usr/bin/env node
import { spawn } from 'node:child_process'
import { randomUUID } from 'node:crypto'
import { existsSync, mkdtempSync, readFileSync, rmSync } from 'node:fs'
import { rm } from 'node:fs/promises'
import { constants, tmpdir } from 'node:os'
import { join, resolve } from 'node:path'
import { MIN_THREAD_POOL, readConfig, scoringSettings, settingsHelp, type Config } from './config.ts'
import type { Archive, CommandParts, Scoring, SettingFlags } from './cli/index.ts'
import { InputError } from './errors.ts'

/** Thread pool of a process that this one starts for itself; MIN_THREAD_POOL and some for compression. */
const THREAD_POOL = 16

/** How long running requests may take once the service was told to stop, ms. */
const GRACE_MS = 30_000

const DAY_MS = 86_400_000
const BYTES_PER_MB = 1_000_000

/** Commands that run queries, and so need the larger thread pool. */
const QUERYING = new Set(['serve', 'replay', 'sweep'])

const { version } = JSON.parse(readFileSync(new URL('../package.json', import.meta.url), 'utf8')) as {
  version: string
}
const args = process.argv.slice(2)

const poolSize = Number(process.env['UV_THREADPOOL_SIZE'] ?? 4)
if (QUERYING.has(args[0] ?? '') && !(poolSize >= MIN_THREAD_POOL)) {
  startAgain()
} else {
  dieWithParent()
  const { runCommandLine } = await import('./cli/index.ts')
  const { stdin, stdout, stderr } = process
  const parts: CommandParts = {
    version,
    stdin,
    stdout,
    stderr,
    settingsHelp: settingsHelp(),
    startScoring,
    openArchive,
    serve,
  }
  process.exitCode = await runCommandLine(args, parts)
}

/**
 * Runs the same command in a process with a larger thread pool. The pool is made at the first file that Node reads, which is this
 * one: setting the variable from here would come too late (seen: 4 threads for all).
 */
function startAgain(): void {
  const child = spawn(process.execPath, [...process.execArgv, ...process.argv.slice(1)], {
    stdio: ['inherit', 'inherit', 'inherit', 'ipc'],
    env: { ...process.env, UV_THREADPOOL_SIZE: String(THREAD_POOL) },
  })
  // The keys of a terminal reach both processes; a signal from elsewhere reaches this one alone.
  process.on('SIGINT', () => process.stdin.isTTY || child.kill('SIGINT'))
  for (const signal of ['SIGTERM', 'SIGHUP'] as const) process.on(signal, () => child.kill(signal))
  child.on('error', (error) => {
    process.stderr.write(`error INTERNAL: ${error.message}\n`)
    process.exitCode = 1
  })
  child.on('exit', (code, signal) => {
    process.exitCode = code ?? 128 + constants.signals[signal ?? 'SIGTERM']
  })
}

/** A process that `startAgain` made has nobody to answer to once its parent was killed. */
function dieWithParent(): void {
  if (process.channel === undefined) return
  process.on('disconnect', () => process.kill(process.pid, 'SIGKILL'))
  process.channel.unref()
}

/** Store, worker threads and everything that works on them, over one data folder. */
async function openParts(config: Config, folder: string, report?: (error: unknown) => void) {
  if (config.databaseUrl !== null) {
    throw new InputError(
      'BAD_CONFIG',
      'config databaseUrl: expected none, as this version has the embedded catalogue only',
    )
  }
  const [{ openStore }, { createReplays, openScorers }, { createIntake }, { createSetup }] =
    await Promise.all([
      import('./store/index.ts'),
      import('./replay/index.ts'),
      import('./intake/index.ts'),
      import('./setup/index.ts'),
    ])
  const clock = () => Date.now()
  const newId = () => randomUUID()
  const store = await openStore({
    folder,
    scanMemoryMb: config.scanMemoryMb,
    scanThreads: config.scanThreads,
    ...(config.diskLimitMb === 0 ? {} : { limitBytes: config.diskLimitMb * BYTES_PER_MB }),
    clock,
    newId,
    ...(report === undefined ? {} : { report }),
  })
  const scorers = openScorers(config.scoreThreads)
  const limits = {
    maxDecompressedBytes: config.decompressedLimitMb * BYTES_PER_MB,
    maxLineBytes: config.lineLimitKb * 1000,
    maxColumns: config.columnsLimit,
    maxRows: config.rowsLimit,
  }
  const replays = createReplays({
    store,
    replaysAtOnce: config.replaysAtOnce,
    limits,
    scorers,
    version,
    clock,
    newId,
    ...(report === undefined ? {} : { report }),
  })
  const intake = createIntake({ store, limits, newId })
  const close = async () => {
    await replays.close()
    await scorers.close()
    await store.close()
  }
  return { store, replays, intake, setup: createSetup(store), close }
}

/** What `replay` runs on: a store in a folder that goes away with the process. */
async function startScoring(flags: SettingFlags): Promise<Scoring> {
  const { config, unknownNames } = readConfig(process.env, flags)
  for (const name of unknownNames) process.stderr.write(`warning: ${name} is no setting of yawledger\n`)
  let folder = ''
  const stopped = (signal: 'SIGINT' | 'SIGTERM' | 'SIGHUP') => {
    // What is under way in the thread pool may make folders or files again during a sweep or after it. Nothing new is begun
    // while this thread waits, so that a folder that stays away for a moment stays away.
    for (let round = 0; round < 20; round++) {
      try {
        rmSync(folder, { recursive: true, force: true, maxRetries: 10, retryDelay: 20 })
      } catch {
        // A file that appeared between its folder's listing and the removal: the next round takes it.
      }
      Atomics.wait(new Int32Array(new SharedArrayBuffer(4)), 0, 0, 250)
      if (!existsSync(folder)) break
    }
    process.exit(128 + constants.signals[signal])
  }
  for (const signal of ['SIGINT', 'SIGTERM', 'SIGHUP'] as const) process.once(signal, stopped)
  // Made last and without a wait: a signal that nobody listens to ends the process at once, with the folder left behind.
  folder = mkdtempSync(join(tmpdir(), 'yawledger-'))
  try {
    const { store, replays, intake, close } = await openParts(config, folder)
    return {
      replays,
      intake,
      settings: scoringSettings(config),
      tempFolder: store.tempFolder,
      async close() {
        await close()
        await rm(folder, { recursive: true, force: true })
      },
    }
  } catch (error) {
    await rm(folder, { recursive: true, force: true })
    throw error
  }
}

/** What `sweep` runs on: the data folder of a service that is not running. */
async function openArchive(flags: SettingFlags): Promise<Archive> {
  const { config, unknownNames } = readConfig(process.env, flags)
  for (const name of unknownNames) process.stderr.write(`warning: ${name} is no setting of yawledger\n`)
  const { replays, setup, close } = await openParts(config, resolve(config.dataFolder))
  // What is cut off in the middle is named interrupted by whoever opens the folder next.
  return { replays, setup, settings: scoringSettings(config), close }
}

/** Runs the service until a signal stops it. */
async function serve(flags: SettingFlags): Promise<void> {
  const { config, unknownNames } = readConfig(process.env, flags)
  const [{ pino }, { buildServer }] = await Promise.all([import('pino'), import('./http/index.ts')])
  const logger = pino({ name: 'yawledger', level: config.logLevel })
  for (const name of unknownNames) logger.warn({ name }, 'an environment variable that is no setting')
  const dataFolder = resolve(config.dataFolder)
  const { store, replays, intake, setup, close } = await openParts(config, dataFolder, (error) => {
    logger.error({ err: error }, 'work in the background failed')
  })
  const prune = () => {
    store.frames.prune(config.keepFramesDays * DAY_MS).catch((error: unknown) => {
      logger.error({ err: error }, 'old rows could not be removed')
    })
  }
  try {
    const app = await buildServer({
      replays,
      intake,
      setup,
      settings: scoringSettings(config),
      gate: { atOnce: config.uploadsAtOnce, waiting: config.uploadsWaiting },
      replayCounts: () => store.replays.counts(),
      dataFolder,
      upload: {
        folder: store.tempFolder,
        bodyLimitBytes: config.bodyLimitMb * BYTES_PER_MB,
        idleMs: config.uploadIdleS * 1000,
      },
      ready: () => store.ready(),
      version,
      logger,
    })
    const stop = stopSignal()
    await app.listen({ host: config.host, port: config.port })
    prune()
    const pruning = setInterval(prune, DAY_MS)
    logger.info({ signal: await stop }, 'stopping')
    clearInterval(pruning)
    const tooLong = setTimeout(() => {
      logger.error({ graceMs: GRACE_MS }, 'requests still ran after the grace: cut off')
      process.exit(1)
    }, GRACE_MS)
    await app.close()
    clearTimeout(tooLong)
  } finally {
    await close()
  }
  logger.info('stopped')
}

/** The first signal is the result; one that follows ends the process at once. */
function stopSignal(): Promise<string> {
  return new Promise((done) => {
    let asked = false
    for (const signal of ['SIGTERM', 'SIGINT', 'SIGHUP'] as const) {
      process.on(signal, () => {
        if (asked) process.exit(128 + constants.signals[signal])
        asked = true
        done(signal)
      })
    }
  })
}
