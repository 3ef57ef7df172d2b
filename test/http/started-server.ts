import { mkdtemp, readdir, rm } from 'node:fs/promises'
import type { AddressInfo } from 'node:net'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { buildServer, type ServerParts } from '../../src/http/index.ts'
import { ReplaysInMemory } from './replays-in-memory.ts'
import { settingsExample } from './sheet-example.ts'

/** A server that listens on a free port of the loopback, over a data folder of its own. */
export async function startServer(overrides: Partial<ServerParts> & { bodyLimitBytes?: number } = {}) {
  const dataFolder = await mkdtemp(join(tmpdir(), 'yawledger-http-'))
  const replays = new ReplaysInMemory()
  const { bodyLimitBytes = 1_000_000, ...parts } = overrides
  const app = await buildServer({
    replays,
    settings: settingsExample(),
    dataFolder,
    upload: { folder: dataFolder, bodyLimitBytes, idleMs: 1_000 },
    ready: () => Promise.resolve(),
    version: '0.1.0',
    ...parts,
  })
  await app.listen({ host: '127.0.0.1', port: 0 })
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
