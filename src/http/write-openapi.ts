import { readFileSync, writeFileSync } from 'node:fs'
import { openapiYaml } from './openapi.ts'
import { buildServer } from './server.ts'

/** Writes openapi.yaml from the route schemas; with --check it only says whether the file is up to date (exit 1: it is not). */
const path = new URL('../../openapi.yaml', import.meta.url)
const packagePath = new URL('../../package.json', import.meta.url)
const { version } = JSON.parse(readFileSync(packagePath, 'utf8')) as { version: string }

const unused = () => Promise.reject(new Error('no request is answered here'))
const app = await buildServer({
  version,
  ready: unused,
  replays: { oneShot: unused, get: unused, list: unused, remove: unused },
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
