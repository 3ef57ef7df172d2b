import { readFileSync, writeFileSync } from 'node:fs'
import type { Intake } from '../intake/index.ts'
import type { Replays } from '../replay/contract.ts'
import type { Setup } from '../setup/index.ts'
import { openapiYaml } from './openapi.ts'
import { buildServer } from './server.ts'

/** Writes openapi.yaml from the route schemas; with --check it only says whether the file is up to date (exit 1: it is not). */
const path = new URL('../../openapi.yaml', import.meta.url)
const packagePath = new URL('../../package.json', import.meta.url)
const { version } = JSON.parse(readFileSync(packagePath, 'utf8')) as { version: string }

const unused = () => Promise.reject(new Error('no request is answered here'))
// Nothing is called while routes are added.
const none = {} as unknown
const app = await buildServer({
  version,
  ready: unused,
  replays: none as Replays,
  intake: none as Intake,
  setup: none as Setup,
  replayCounts: unused,
  gate: { atOnce: 1, waiting: 0 },
  // Defaults of the service do not stand in the description, so that it is the same for every installation.
  settings: {} as never,
  dataFolder: '/',
  upload: { folder: '/', bodyLimitBytes: 1, idleMs: 1 },
})
await app.ready()
const yaml = openapiYaml(app)
await app.close()

if (!process.argv.includes('--check')) {
  writeFileSync(path, yaml)
} else if (readFileSync(path, 'utf8') !== yaml) {
  process.stderr.write('openapi.yaml differs from the route schemas: run `npm run openapi`\n')
  process.exitCode = 1
}
