import { readFileSync } from 'node:fs'
import { setTimeout as wait } from 'node:timers/promises'
import { afterAll, beforeAll, expect, test } from 'vitest'
import type { ScoreSheet } from '../../src/sheet/index.ts'
import { codeOf, jsonCalls } from './json-calls.ts'
import { startServerOnStore, type ServerOnStore } from './started-server.ts'

let server: ServerOnStore
let sheet: ScoreSheet
const { put, post, get, remove } = jsonCalls(() => server.url)
const SITE = '/v1/sites/quern-hill'
// Two hundred resamples are the fewest that the settings take: what is tested is the way there and back.
const WINDOW = {
  site: 'quern-hill',
  from: '2026-03-01T00:00:00Z',
  to: '2026-04-01T00:00:00Z',
  options: { resamples: 200, assumedResponsePctPerDeg: 0 },
}

beforeAll(async () => {
  server = await startServerOnStore()
  const read = (name: string) => readFileSync(new URL(`../../data-demo/${name}`, import.meta.url))
  await put(SITE, read('quern-hill.site.json').toString())
  const log = await fetch(`${server.url}${SITE}/logs?name=march.csv.gz`, {
    method: 'POST',
    body: read('quern-hill-2026-03.csv.gz'),
    headers: { 'content-type': 'application/gzip' },
  })
  expect(log.status).toBe(201)
  const response = await post('/v1/replays', WINDOW)
  expect(response.status).toBe(201)
  sheet = (await response.json()) as ScoreSheet
  expect(response.headers.get('location')).toBe(`/v1/replays/${sheet.replay}`)
}, 120_000)
afterAll(async () => {
  await server.stop()
})

test('stored logs are scored to a whole sheet that is read again byte for byte', async () => {
  expect(sheet.site).toBe('quern-hill')
  expect(sheet.rows.received).toBe(sheet.rows.accepted + sheet.rows.duplicate + sheet.rows.rejected)
  expect(sheet.turbines.length).toBeGreaterThan(1)
  expect(sheet.provenance.settings).toMatchObject({ resamples: 200, assumedResponsePctPerDeg: 0 })
  const again = await get(`/v1/replays/${sheet.replay}`)
  expect(await again.json()).toEqual(sheet)
  const etag = again.headers.get('etag') ?? ''
  expect((await get(`/v1/replays/${sheet.replay}`, { 'if-none-match': etag })).status).toBe(304)
})

test('respond-async answers 202 at once, shows how far it is, and ends with the sheet', async () => {
  const turbine = sheet.turbines[0]?.turbine ?? ''
  const accepted = await post(
    '/v1/replays',
    { ...WINDOW, turbines: [turbine] },
    { prefer: 'wait=1, respond-async' },
  )
  expect(accepted.status).toBe(202)
  expect(accepted.headers.get('preference-applied')).toBe('respond-async')
  const location = accepted.headers.get('location') ?? ''
  const noted = (await accepted.json()) as { state: string; href: string }
  expect(['queued', 'running']).toContain(noted.state)
  expect(noted.href).toBe(location)
  let answer = await get(location)
  for (let i = 0; i < 1200 && answer.headers.get('retry-after') !== null; i++) {
    expect(await answer.json()).toMatchObject({ href: location })
    await wait(50)
    answer = await get(location)
  }
  const done = (await answer.json()) as ScoreSheet
  expect(done.turbines.map((one) => one.turbine)).toEqual([turbine])
  expect((await remove(location)).status).toBe(204)
  expect(await codeOf(await get(location))).toBe('404 REPLAY_NOT_FOUND')
}, 120_000)

test('a replay that waits or runs is cancelled by DELETE, and its state stays to be read', async () => {
  const accepted = await post('/v1/replays', WINDOW, { prefer: 'respond-async' })
  const location = accepted.headers.get('location') ?? ''
  expect((await remove(location)).status).toBe(204)
  let state = ''
  for (let i = 0; i < 200 && state !== 'cancelled'; i++) {
    state = ((await (await get(location)).json()) as { state: string }).state
    await wait(20)
  }
  expect(state).toBe('cancelled')
  expect((await remove(location)).status).toBe(204)
}, 60_000)

test.each([
  [{ site: 'nowhere' }, '404 SITE_NOT_FOUND'],
  [{ turbines: ['Q77'] }, '404 TURBINE_NOT_FOUND'],
  [{ to: '2026-03-01T00:00:00Z' }, '400 BAD_REQUEST'],
  [{ to: '2026-12-31T23:59:60Z' }, '400 BAD_OPTION'],
  [{ from: '2027-03-01T00:00:00Z', to: '2027-04-01T00:00:00Z' }, '422 LOG_NO_ROWS'],
  [{ turbines: [] }, '400 BAD_REQUEST'],
  [{ options: { assumedResponsePctPerDeg: 6 } }, '400 BAD_REQUEST'],
  [{ windows: 1 }, '400 BAD_REQUEST'],
])('a request with %j is refused: %s', async (change, expected) => {
  expect(await codeOf(await post('/v1/replays', { ...WINDOW, ...change }))).toBe(expected)
})

test('rows are streamed as CSV, Parquet and an Arrow stream, by Accept or by format', async () => {
  const path = `/v1/replays/${sheet.replay}/rows`
  const csv = await get(path)
  expect(csv.headers.get('content-type')).toMatch(/^text\/csv/)
  const lines = (await csv.text()).trimEnd().split('\n')
  expect(lines[0]).toMatch(/^time,turbine,set_aside,/)
  // A header, and a row for every one that counts.
  expect(lines.length - 1).toBe(sheet.turbines.reduce((sum, one) => sum + one.rows.accepted, 0))
  const parquet = Buffer.from(
    await (await get(path, { accept: 'application/vnd.apache.parquet' })).arrayBuffer(),
  )
  // A Parquet file begins and ends with its magic number; an Arrow stream begins with a continuation mark.
  expect(parquet.subarray(0, 4).toString() + parquet.subarray(-4).toString()).toBe('PAR1PAR1')
  const arrow = await get(`${path}?format=arrow`)
  expect(arrow.headers.get('content-type')).toBe('application/vnd.apache.arrow.stream')
  expect(Buffer.from(await arrow.arrayBuffer()).readUInt32LE(0)).toBe(0xffffffff)
  const etag = csv.headers.get('etag') ?? ''
  expect((await get(path, { 'if-none-match': etag })).status).toBe(304)
  expect(await codeOf(await get(path, { accept: 'image/png' }))).toBe('406 NOT_ACCEPTABLE')
  expect(await codeOf(await get('/v1/replays/none/rows'))).toBe('404 REPLAY_NOT_FOUND')
}, 60_000)

test('a reader that leaves in the middle of the rows breaks nothing', async () => {
  const gone = new AbortController()
  const response = await fetch(`${server.url}/v1/replays/${sheet.replay}/rows`, { signal: gone.signal })
  await response.body?.getReader().read()
  gone.abort()
  expect((await get('/health/live')).status).toBe(200)
  expect((await get(`/v1/replays/${sheet.replay}/rows?format=parquet`)).status).toBe(200)
})

test('each question is answered from the newest sheet that holds the turbine', async () => {
  const wanted = sheet.turbines[0]
  const path = `${SITE}/turbines/${wanted?.turbine ?? ''}`
  const head = { replay: sheet.replay, window: sheet.window, verdict: wanted?.verdict }
  expect(await (await get(`${path}/static-offset`)).json()).toMatchObject({
    ...head,
    staticOffset: wanted?.staticOffset,
    cautions: wanted?.cautions,
  })
  expect(await (await get(`${path}/yaw-error`)).json()).toMatchObject({ ...head, yawError: wanted?.yawError })
  expect(await (await get(`${path}/energy-loss`)).json()).toMatchObject({
    ...head,
    energyLoss: wanted?.energyLoss,
  })
  expect(await (await get(`${path}/sensors`)).json()).toMatchObject({ ...head, sensors: wanted?.sensors })
  expect(await (await get(`${path}/yaw-activity`)).json()).toMatchObject({
    ...head,
    yawActivity: wanted?.yawActivity,
  })
  const csv = await get(`${path}/yaw-error`, { accept: 'text/csv' })
  expect(csv.headers.get('content-type')).toBe('text/csv; charset=utf-8')
  const lines = (await csv.text()).trimEnd().split('\n')
  expect(lines[0]).toBe('from,to,rows,meanDeg,circularSdDeg')
  expect(lines.length - 1).toBe(wanted?.yawError.byWindSpeed.length)
  const estimates = await get(`${path}/static-offset?table=estimates`, { accept: 'text/csv' })
  expect(await estimates.text()).toMatch(/^method,estimateDeg,lowerDeg,upperDeg,/)
  expect(await codeOf(await get(`${path}/static-offset?table=band`))).toBe('400 BAD_OPTION')
})

test('the worklist is JSON, CSV or a work order with every caution', async () => {
  const json = (await (await get(`${SITE}/worklist`)).json()) as {
    worklist: unknown[]
    unsettled: { turbine: string }[]
  }
  expect(json).toMatchObject({ replay: sheet.replay, site: 'quern-hill', worklist: sheet.worklist })
  const open = sheet.turbines.filter(({ verdict }) => verdict === 'undetermined' || verdict === 'blocked')
  // In order of what they may bring.
  expect(json.unsettled.map(({ turbine }) => turbine).sort()).toEqual(
    open.map(({ turbine }) => turbine).sort(),
  )
  const csv = await (await get(`${SITE}/worklist`, { accept: 'text/csv' })).text()
  expect(csv).toMatch(/^rank,turbine/)
  const order = await get(`${SITE}/worklist`, { accept: 'text/plain' })
  expect(order.headers.get('content-type')).toBe('text/plain; charset=utf-8')
  const text = (await order.text()).replaceAll(/\s+/g, ' ')
  expect(text).toContain('Worklist of quern-hill, 2026-03-01 00:00 to')
  for (const { turbine, cautions } of sheet.worklist) {
    expect(text).toContain(`. ${turbine} misalignment m:`)
    for (const caution of cautions) expect(text).toContain(caution)
  }
})

test('a turbine or site without an answer says which of the two is missing', async () => {
  expect(await codeOf(await get(`${SITE}/turbines/Q77/sensors`))).toBe('404 TURBINE_NOT_FOUND')
  await put('/v1/sites/mill-farm/', {})
  await put('/v1/sites/mill-farm', { turbines: [{ turbine: 'M1' }] })
  expect(await codeOf(await get('/v1/sites/mill-farm/turbines/M1/sensors'))).toBe('404 REPLAY_NOT_FOUND')
  expect(await codeOf(await get('/v1/sites/mill-farm/worklist'))).toBe('404 REPLAY_NOT_FOUND')
  expect(await codeOf(await get('/v1/sites/none/worklist'))).toBe('404 SITE_NOT_FOUND')
})

test('replays are listed by site and state', async () => {
  const listed = (await (await get('/v1/replays?site=quern-hill&state=done')).json()) as {
    replays: { replay: string }[]
  }
  expect(listed.replays.map(({ replay }) => replay)).toContain(sheet.replay)
  expect(await (await get('/v1/replays?site=mill-farm')).json()).toEqual({ replays: [], next: null })
})

test('rows that were removed by age are gone, and the sheet is not', async () => {
  await server.store.frames.remove(sheet.replay)
  expect(await codeOf(await get(`/v1/replays/${sheet.replay}/rows`))).toBe('410 FRAME_GONE')
  expect((await get(`/v1/replays/${sheet.replay}`)).status).toBe(200)
})
