import { spawn, type ChildProcess } from 'node:child_process'
import { once } from 'node:events'
import { existsSync } from 'node:fs'
import { mkdtemp, readdir, readFile, rm } from 'node:fs/promises'
import { createServer, type AddressInfo } from 'node:net'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { setTimeout as wait } from 'node:timers/promises'
import { fileURLToPath } from 'node:url'
import { afterEach, beforeEach, expect, test } from 'vitest'
import { ScoreSheet } from '../src/sheet/index.ts'
import { checkShape } from '../src/setup/index.ts'

const ROOT = fileURLToPath(new URL('..', import.meta.url))
const BUILT = existsSync(join(ROOT, 'dist/main.js'))
const ON_LINUX = process.platform === 'linux'

/** A farm of one turbine and three days: enough to pass through every room, too short for a verdict. */
const SMALL_FARM = ['--turbines', '1', '--days', '3', '--seed', '5']

let folder: string
const started: ChildProcess[] = []

beforeEach(async () => {
  folder = await mkdtemp(join(tmpdir(), 'yawledger-main-'))
})
afterEach(async () => {
  for (const child of started.splice(0)) child.kill('SIGKILL')
  await rm(folder, { recursive: true, force: true, maxRetries: 5, retryDelay: 100 })
})

/** Starts the built program, with temporary files in the folder of the test. */
function start(args: string[], environment: Record<string, string> = {}) {
  const child = spawn(process.execPath, [join(ROOT, 'dist/main.js'), ...args], {
    cwd: folder,
    env: { ...process.env, UV_THREADPOOL_SIZE: '', TMPDIR: folder, ...environment },
    stdio: ['pipe', 'pipe', 'pipe'],
  })
  started.push(child)
  const output = { out: '', err: '' }
  child.stdout.on('data', (bytes: Buffer) => (output.out += bytes.toString()))
  child.stderr.on('data', (bytes: Buffer) => (output.err += bytes.toString()))
  const ended = once(child, 'close').then(([status]) => ({ status: status as number | null, ...output }))
  return { child, ended, output }
}

async function freePort(): Promise<number> {
  const probe = createServer().listen(0, '127.0.0.1')
  await once(probe, 'listening')
  const { port } = probe.address() as AddressInfo
  probe.close()
  await once(probe, 'close')
  return port
}

async function startService(environment: Record<string, string> = {}) {
  const port = await freePort()
  const service = start(['serve', '--port', `${port}`, '--data', join(folder, 'data')], environment)
  const url = `http://127.0.0.1:${port}`
  for (let i = 0; i < 300; i++) {
    const answer = await fetch(`${url}/health/ready`).catch(() => undefined)
    if (answer?.ok === true) return { ...service, url }
    await wait(50)
  }
  throw new Error(`the service did not start: ${service.output.out}${service.output.err}`)
}

async function smallLog(): Promise<{ log: string; site: string }> {
  const { status } = await start(['simulate', '--out', folder, ...SMALL_FARM]).ended
  expect(status).toBe(0)
  const names = await readdir(folder)
  const path = (end: string) => join(folder, names.find((name) => name.endsWith(end)) ?? end)
  return { log: path('.csv.gz'), site: path('.site.json') }
}

test.skipIf(!BUILT)(
  'a log is scored from the command line to a whole sheet, and no temporary file stays',
  async () => {
    const { log, site } = await smallLog()
    const before = await readdir(folder)
    const { status, out, err } = await start(['replay', log, '--site', site]).ended
    expect(err).toBe('')
    expect(status).toBe(0)
    const sheet = checkShape(ScoreSheet, JSON.parse(out), { code: 'INTERNAL', place: 'sheet' })
    expect(sheet.rows.received).toBe(sheet.rows.accepted + sheet.rows.duplicate + sheet.rows.rejected)
    expect(sheet.turbines).toHaveLength(1)
    expect(await readdir(folder)).toEqual(before)
  },
)

test.skipIf(!BUILT)('command line and service give the same sheet for the same log', async () => {
  const { log, site } = await smallLog()
  const printed = JSON.parse((await start(['replay', log, '--site', site]).ended).out) as ScoreSheet
  const { url } = await startService()
  const form = new FormData()
  form.set('site', await readFile(site, 'utf8'))
  form.append('log', new Blob([await readFile(log)]), log.split('/').at(-1))
  const response = await fetch(`${url}/v1/replays`, { method: 'POST', body: form })
  expect(response.status).toBe(201)
  const answered = (await response.json()) as ScoreSheet
  expect({ ...answered, replay: '' }).toEqual({ ...printed, replay: '' })
})

test.skipIf(!BUILT)(
  'the service keeps a sheet over a restart, and stops on SIGTERM with status 0',
  async () => {
    const { log } = await smallLog()
    const first = await startService()
    const response = await fetch(`${first.url}/v1/replays`, {
      method: 'POST',
      body: await readFile(log),
      headers: { 'content-type': 'application/gzip' },
    })
    const sheet = await response.text()
    const location = response.headers.get('location') ?? ''
    first.child.kill('SIGTERM')
    expect((await first.ended).status).toBe(0)
    expect(await readdir(join(folder, 'data/temp'))).toEqual([])
    const second = await startService()
    expect(await (await fetch(`${second.url}${location}`)).text()).toBe(sheet)
  },
)

test.skipIf(!BUILT)(
  'a sweep scores what a service has stored, and the service answers it afterwards',
  async () => {
    const { log } = await smallLog()
    const first = await startService()
    const put = await fetch(`${first.url}/v1/sites/mill-farm`, {
      method: 'PUT',
      body: '{}',
      headers: { 'content-type': 'application/json' },
    })
    expect(put.status).toBe(201)
    const posted = await fetch(`${first.url}/v1/sites/mill-farm/logs`, {
      method: 'POST',
      body: await readFile(log),
      headers: { 'content-type': 'application/gzip' },
    })
    expect(posted.status).toBe(201)
    const window = ['--from', '2020-01-01', '--to', '2030-01-01', '--data', join(folder, 'data')]
    // The folder belongs to the service as long as it runs.
    const early = await start(['sweep', '--all', ...window]).ended
    expect(early.status).toBe(1)
    expect(early.err).toMatch(/^error NOT_READY: /)
    first.child.kill('SIGTERM')
    expect((await first.ended).status).toBe(0)
    const { status, out, err } = await start(['sweep', '--all', ...window]).ended
    expect(err).toBe('')
    expect(status).toBe(0) // three days settle nothing
    expect(out).toContain('Worklist of mill-farm, ')
    expect(out).toContain('Without a verdict, and so neither on the list nor aligned; most at stake first:')
    const second = await startService()
    const worklist: unknown = await (await fetch(`${second.url}/v1/sites/mill-farm/worklist`)).json()
    expect(worklist).toMatchObject({ site: 'mill-farm', worklist: [] })
  },
)

test.skipIf(!BUILT)('rows are written beside the sheet of a log', async () => {
  const { log } = await smallLog()
  const rows = join(folder, 'rows.csv')
  const { status, out } = await start(['replay', log, '--rows', rows]).ended
  expect(status).toBe(0)
  const sheet = JSON.parse(out) as ScoreSheet
  const lines = (await readFile(rows, 'utf8')).trimEnd().split('\n')
  expect(lines.length - 1).toBe(sheet.rows.accepted)
})

test.skipIf(!BUILT || !ON_LINUX)(
  'queries get a thread pool that leaves threads for files (seen in /proc)',
  async () => {
    const { output } = await startService()
    const { pid } = JSON.parse(output.out.split('\n', 1)[0] ?? '{}') as { pid: number }
    const environment = (await readFile(`/proc/${pid}/environ`, 'utf8')).split('\0')
    const size = Number(environment.find((one) => one.startsWith('UV_THREADPOOL_SIZE='))?.split('=')[1])
    expect(size).toBeGreaterThanOrEqual(12)
  },
)

test.skipIf(!BUILT)('a pool that is large enough is left as it is, in one process', async () => {
  const { child, output } = await startService({ UV_THREADPOOL_SIZE: '20' })
  const { pid } = JSON.parse(output.out.split('\n', 1)[0] ?? '{}') as { pid: number }
  expect(pid).toBe(child.pid)
})

test.skipIf(!BUILT)('a service that is killed outright takes its own child with it', async () => {
  const { child, url } = await startService()
  child.kill('SIGKILL')
  let refused = false
  for (let i = 0; i < 100 && !refused; i++) {
    refused = await fetch(`${url}/health/live`).then(
      () => false,
      () => true,
    )
    await wait(20)
  }
  expect(refused).toBe(true)
})

test.skipIf(!BUILT)('a wrong setting stops the start with its name and status 2', async () => {
  const { status, out, err } = await start(['serve'], { YAWLEDGER_PORT: 'abc' }).ended
  expect(status).toBe(2)
  expect(out).toBe('')
  expect(err).toBe('error BAD_CONFIG: config port: expected 1-65535, got "abc" (YAWLEDGER_PORT)\n')
})

test.skipIf(!BUILT)('a folder that another service holds is refused', async () => {
  await startService()
  const second = start(['serve', '--port', `${await freePort()}`, '--data', join(folder, 'data')])
  const { status, err } = await second.ended
  expect(status).toBe(1)
  expect(err).toMatch(/^error NOT_READY: /)
})

test.skipIf(!BUILT)('a reader that closes the pipe early is no failure', async () => {
  const { log } = await smallLog()
  const { child, ended } = start(['replay', log])
  child.stdout.destroy()
  const { status, err } = await ended
  expect(err).toBe('')
  expect(status).toBe(0)
})

test.skipIf(!BUILT)('an interrupted replay leaves no temporary file', async () => {
  const { log } = await smallLog()
  const before = await readdir(folder)
  const { child, ended } = start(['replay', log, '-'])
  // Standard input stays open, so that the run waits for it with its folder in place.
  for (let i = 0; i < 200 && (await readdir(folder)).length === before.length; i++) await wait(20)
  expect((await readdir(folder)).length).toBeGreaterThan(before.length)
  child.kill('SIGTERM')
  expect((await ended).status).toBe(143)
  expect(await readdir(folder)).toEqual(before)
})
