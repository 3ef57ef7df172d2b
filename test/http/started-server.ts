import { randomUUID } from 'node:crypto'
import { mkdir, mkdtemp, readdir, rm } from 'node:fs/promises'
import type { AddressInfo } from 'node:net'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { buildServer, type ServerParts } from '../../src/http/index.ts'
import { createIntake, type Intake } from '../../src/intake/index.ts'
import { DEFAULT_LIMITS } from '../../src/log/index.ts'
import { createReplays, openScorers } from '../../src/replay/index.ts'
import { createSetup, type Setup } from '../../src/setup/index.ts'
import { openStore } from '../../src/store/index.ts'
import { ReplaysInMemory } from './replays-in-memory.ts'
import { settingsExample } from './sheet-example.ts'

type Overrides = Partial<ServerParts> & { bodyLimitBytes?: number }

const LOOPBACK = { host: '127.0.0.1', port: 0 }

/** A server that listens on a free port of the loopback, over replays in memory, for what needs no store. */
export async function startServer(overrides: Overrides = {}) {
  const dataFolder = await mkdtemp(join(tmpdir(), 'yawledger-http-'))
  const replays = new ReplaysInMemory()
  const { bodyLimitBytes = 1_000_000, ...parts } = overrides
  const app = await buildServer({
    replays,
    intake: {} as Intake,
    setup: {} as Setup,
    settings: settingsExample(),
    dataFolder,
    upload: { folder: dataFolder, bodyLimitBytes, idleMs: 1_000 },
    gate: { atOnce: 2, waiting: 16 },
    replayCounts: () => Promise.resolve({}),
    ready: () => Promise.resolve(),
    version: '0.1.0',
    ...parts,
  })
  await app.listen(LOOPBACK)
  const { port } = app.server.address() as AddressInfo
  return {
    app,
    replays,
    dataFolder,
    port,
    url: `http://127.0.0.1:${port}`,
    /** Names of what uploads left on disk. */
    leftovers: () => readdir(dataFolder),
    stop: async () => {
      await app.close()
      await rm(dataFolder, { recursive: true, force: true })
    },
  }
}
export type StartedServer = Awaited<ReturnType<typeof startServer>>

/** The same over a store of its own in a temporary folder; `inMemory` alone may replace what scores. */
export async function startServerOnStore(options: { inMemory?: boolean } & Overrides = {}) {
  const folder = await mkdtemp(join(tmpdir(), 'yawledger-http-store-'))
  const { inMemory = false, ...overrides } = options
  const parts = { clock: () => Date.now(), newId: () => randomUUID() }
  const store = await openStore({ folder, ...parts })
  const scorers = openScorers(0)
  const real = createReplays({ store, limits: DEFAULT_LIMITS, scorers, version: '0.1.0', ...parts })
  const uploads = join(store.tempFolder, 'uploads')
  await mkdir(uploads)
  const server = await startServer({
    ...(inMemory ? {} : { replays: real }),
    intake: createIntake({ store, limits: DEFAULT_LIMITS, newId: parts.newId }),
    setup: createSetup(store),
    upload: { folder: uploads, bodyLimitBytes: 50_000_000, idleMs: 1_000 },
    replayCounts: () => store.replays.counts(),
    ...overrides,
  })
  return {
    ...server,
    store,
    leftovers: () => readdir(uploads),
    stop: async () => {
      await server.stop()
      await real.close()
      await store.close()
      await rm(folder, { recursive: true, force: true })
    },
  }
}
export type ServerOnStore = Awaited<ReturnType<typeof startServerOnStore>>
