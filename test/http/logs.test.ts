import { gzipSync } from 'node:zlib'
import { setTimeout as wait } from 'node:timers/promises'
import { afterEach, beforeEach, expect, test } from 'vitest'
import { codeOf, jsonCalls } from './json-calls.ts'
import { startServerOnStore, type ServerOnStore } from './started-server.ts'

let server: ServerOnStore
const { put, post, get, remove } = jsonCalls(() => server.url)

beforeEach(async () => {
  server = await startServerOnStore({ inMemory: true })
  await put('/v1/sites/quern-hill', { turbines: [{ turbine: 'Q01' }], intervalS: 600 })
})
afterEach(async () => {
  await server.stop()
})

const LOGS = '/v1/sites/quern-hill/logs'
const GOOD = [
  'time,turbine,wind_speed,vane,power',
  '2026-03-01T00:00:00Z,Q01,8,1,900',
  '2026-03-01T00:10:00Z,Q01,8,1,900',
  '2026-03-02T00:00:00Z,Q01,8,1,900',
  '',
].join('\n')
const WITH_REJECTED = `${GOOD}never,Q01,8,1,900\n`

interface Stored {
  batch: string
  href: string
  rejectedHref: string
  receipt: { received: number; accepted: number; rejected: number; inputs: { name: string }[] }
}

function send(
  body: string | Buffer | FormData,
  query = '',
  headers: Record<string, string> = { 'content-type': 'text/csv' },
) {
  return fetch(`${server.url}${LOGS}${query}`, { method: 'POST', body, headers })
}
async function sent(...given: Parameters<typeof send>) {
  return (await (await send(...given)).json()) as Stored
}

test('a log is stored once: the same bytes are answered with the first receipt', async () => {
  const first = await send(WITH_REJECTED)
  const stored = (await first.json()) as Stored
  expect(first.status).toBe(201)
  expect(first.headers.get('location')).toBe(stored.href)
  expect(stored.receipt).toMatchObject({ received: 4, accepted: 3, rejected: 1 })
  const again = await send(WITH_REJECTED)
  expect(again.status).toBe(200)
  expect(await again.json()).toEqual(stored)
  const read = await get(stored.href)
  expect(await read.json()).toEqual(stored)
  const same = await get(stored.href, { 'if-none-match': read.headers.get('etag') ?? '' })
  expect(same.status).toBe(304)
  for (let i = 0; i < 100 && (await server.leftovers()).length > 0; i++) await wait(20)
  expect(await server.leftovers()).toEqual([])
})

test('a log for a site that was never put is refused with how to put it, before it is read', async () => {
  const response = await fetch(`${server.url}/v1/sites/querm-hill/logs`, {
    method: 'POST',
    body: GOOD,
    headers: { 'content-type': 'text/csv' },
  })
  expect(response.status).toBe(404)
  expect(await response.json()).toMatchObject({
    code: 'SITE_NOT_FOUND',
    detail: expect.stringContaining('PUT /v1/sites/{site}') as string,
  })
})

test.each([
  ['gzip', () => gzipSync(GOOD), 'application/gzip'],
  [
    'one JSON object per line',
    () =>
      Buffer.from(
        GOOD.trim()
          .split('\n')
          .slice(1)
          .map((line) => {
            const [time, turbine, speed, vane, power] = line.split(',')
            return JSON.stringify({
              time,
              turbine,
              wind_speed: Number(speed),
              vane: Number(vane),
              power: Number(power),
            })
          })
          .join('\n'),
      ),
    'application/x-ndjson',
  ],
] as const)('%s is taken', async (_, body, type) => {
  expect((await sent(body(), '', { 'content-type': type })).receipt.accepted).toBe(3)
})

test('Parquet is taken', async () => {
  // The segment of a first log is Parquet with the canonical columns.
  await sent(GOOD)
  const window = await server.store.logs.readWindow('quern-hill', {})
  const { readFile } = await import('node:fs/promises')
  const bytes = await readFile(window.path ?? '')
  await put('/v1/sites/mill-farm', {})
  const response = await fetch(`${server.url}/v1/sites/mill-farm/logs`, {
    method: 'POST',
    body: bytes,
    headers: { 'content-type': 'application/vnd.apache.parquet' },
  })
  expect(response.status).toBe(201)
  expect(((await response.json()) as Stored).receipt.accepted).toBe(3)
})

test('the name of a log comes from the query, then from Content-Disposition, then from the form', async () => {
  const names = async (...given: Parameters<typeof send>) =>
    (await sent(...given)).receipt.inputs.map(({ name }) => name)
  const headers = {
    'content-type': 'text/csv',
    'content-disposition': 'attachment; filename="from-header.csv"',
  }
  expect(await names(GOOD, '?name=../march.csv', headers)).toEqual(['march.csv'])
  expect(await names(`${GOOD}\n`, '', headers)).toEqual(['from-header.csv'])
  const form = new FormData()
  form.append('log', new Blob([GOOD.replaceAll('Q01', 'Q02')]), 'a.csv')
  form.append('log', new Blob([GOOD.replaceAll('Q01', 'Q03')]), 'b.csv')
  expect(await names(form, '', {})).toEqual(['a.csv', 'b.csv'])
})

test('a form with a site file is refused: the site has its own address', async () => {
  const form = new FormData()
  form.set('site', '{}')
  form.append('log', new Blob([GOOD]), 'a.csv')
  expect(await codeOf(await send(form, '', {}))).toBe('400 BAD_REQUEST')
  expect(await codeOf(await post(LOGS, {}))).toBe('415 UNSUPPORTED_MEDIA_TYPE')
})

test('a dry run says how the log would be read and stores nothing', async () => {
  const response = await send(GOOD, '?dryRun=true&name=march.csv&timezone=Europe/Berlin')
  expect(response.status).toBe(200)
  const { logs } = (await response.json()) as { logs: { columns: { column: string; takenFor: string }[] }[] }
  expect(logs).toHaveLength(1)
  expect(logs[0]).toMatchObject({
    name: 'march.csv',
    timezone: 'Europe/Berlin',
    delimiter: ',',
    problem: null,
  })
  expect(logs[0]?.columns.map(({ takenFor }) => takenFor)).toEqual([
    'time',
    'turbine',
    'wind_speed',
    'vane',
    'power',
  ])
  expect(await (await get(LOGS)).json()).toEqual({ logs: [], next: null })
  const oneShot = await fetch(`${server.url}/v1/replays?dryRun=true`, {
    method: 'POST',
    body: GOOD,
    headers: { 'content-type': 'text/csv' },
  })
  expect(oneShot.status).toBe(200)
  expect(await oneShot.json()).toMatchObject({ logs: [{ problem: null }] })
  expect(server.replays.requests).toHaveLength(0)
})

test('rejected rows are read as CSV, and a log without any has the header alone', async () => {
  const bad = await get((await sent(WITH_REJECTED)).rejectedHref)
  expect(bad.headers.get('content-type')).toBe('text/csv; charset=utf-8')
  const [header, row] = (await bad.text()).split('\n')
  expect(row).toContain('never')
  const good = await get((await sent(GOOD)).rejectedHref)
  expect(good.status).toBe(200)
  expect(await good.text()).toBe(`${header ?? ''}\n`)
})

test('stored logs are listed newest first, page by page, and removed one by one', async () => {
  const batches: string[] = []
  for (const power of [900, 901, 902]) {
    batches.unshift((await sent(GOOD.replaceAll('900', `${power}`))).batch)
    await wait(2) // a list goes by the millisecond of its entries
  }
  const first = (await (await get(`${LOGS}?limit=2`)).json()) as { logs: Stored[]; next: string }
  const rest = (await (await get(`${LOGS}?limit=2&after=${first.next}`)).json()) as {
    logs: Stored[]
    next: null
  }
  expect([...first.logs, ...rest.logs].map(({ batch }) => batch)).toEqual(batches)
  expect(rest.next).toBeNull()
  expect(await codeOf(await get(`${LOGS}?after=x`))).toBe('400 BAD_REQUEST')
  expect((await remove(`${LOGS}/${batches[0] ?? ''}`)).status).toBe(204)
  expect(await codeOf(await get(`${LOGS}/${batches[0] ?? ''}`))).toBe('404 BATCH_NOT_FOUND')
  expect(await codeOf(await get(`${LOGS}/${batches[0] ?? ''}/rejected`))).toBe('404 BATCH_NOT_FOUND')
})

test('coverage counts what is there against what a full day would have', async () => {
  await sent(GOOD)
  const path = '/v1/sites/quern-hill/turbines/Q01/coverage'
  // A day holds 144 intervals of ten minutes.
  expect(await (await get(path)).json()).toMatchObject({
    intervalS: 600,
    days: [
      { day: '2026-03-01', rows: 2, expected: 144 },
      { day: '2026-03-02', rows: 1, expected: 144 },
    ],
  })
  const hour = await get(`${path}?from=2026-03-01T00:00:00Z&to=2026-03-01T01:00:00%2B00:00`)
  expect(await hour.json()).toMatchObject({ days: [{ day: '2026-03-01', rows: 2, expected: 6 }] })
  expect(await codeOf(await get(`${path}?from=2026-03-02T00:00:00Z&to=2026-03-01T00:00:00Z`))).toBe(
    '400 BAD_REQUEST',
  )
  expect(await codeOf(await get(`${path}?from=2026-12-31T23:59:60Z`))).toBe('400 BAD_OPTION')
  expect(await codeOf(await get('/v1/sites/quern-hill/turbines/Q77/coverage'))).toBe('404 TURBINE_NOT_FOUND')
})
