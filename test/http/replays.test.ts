import { once } from 'node:events'
import { connect } from 'node:net'
import { setTimeout as wait } from 'node:timers/promises'
import { gzipSync } from 'node:zlib'
import { afterEach, beforeEach, expect, test } from 'vitest'
import { InputError } from '../../src/errors.ts'
import { startServer, type StartedServer } from './started-server.ts'

const LOG = 'time,turbine,wind_speed\n2026-03-01T00:00:00Z,Q01,8.1\n'
const CSV = { 'content-type': 'text/csv' }

let server: StartedServer

beforeEach(async () => {
  server = await startServer()
})
afterEach(async () => {
  await server.stop()
})

function post(path: string, body: string | Buffer | null, headers: Record<string, string> = CSV) {
  return fetch(`${server.url}${path}`, { method: 'POST', body, headers })
}

async function problemOf(response: Response) {
  expect(response.headers.get('content-type')).toBe('application/problem+json')
  return (await response.json()) as { code: string; status: number; detail: string; requestId: string }
}

/** Waits for what happens after an answer, such as the removal of a file; fails after two seconds. */
async function eventually(check: () => Promise<boolean>) {
  for (let i = 0; i < 100 && !(await check()); i++) await wait(20)
  expect(await check()).toBe(true)
}

test('a posted log is answered with the stored bytes of its score sheet, and its address', async () => {
  const response = await post('/v1/replays', LOG)
  const answered = await response.text()
  expect(response.status).toBe(201)
  expect(response.headers.get('location')).toBe('/v1/replays/replay-1')
  expect(answered).toBe(server.replays.records.get('replay-1')?.sheet)
  const again = await fetch(`${server.url}/v1/replays/replay-1`)
  expect(again.status).toBe(200)
  expect(await again.text()).toBe(answered)
  expect(again.headers.get('etag')).toBe(response.headers.get('etag'))
})

test('the log reaches the replay byte for byte as it was sent, and is removed afterwards', async () => {
  const bytes = gzipSync(LOG)
  await post('/v1/replays', bytes, { 'content-type': 'application/gzip' })
  expect(server.replays.bodies[0]?.[0]?.equals(bytes)).toBe(true)
  await eventually(async () => (await server.leftovers()).length === 0)
})

test('Content-Encoding gzip leaves the gzip bytes to the log reader', async () => {
  const bytes = gzipSync(LOG)
  const response = await post('/v1/replays', bytes, { ...CSV, 'content-encoding': 'gzip' })
  expect(response.status).toBe(201)
  expect(server.replays.bodies[0]?.[0]?.equals(bytes)).toBe(true)
})

test('a .gz file that was encoded once more for the way loses one layer', async () => {
  const inner = gzipSync(LOG)
  const headers = { 'content-type': 'application/gzip', 'content-encoding': 'gzip' }
  const response = await post('/v1/replays', gzipSync(inner), headers)
  expect(response.status).toBe(201)
  expect(server.replays.bodies[0]?.[0]?.equals(inner)).toBe(true)
})

test('a doubly encoded body that is cut short is damaged', async () => {
  const outer = gzipSync(gzipSync(LOG.repeat(50)), { level: 0 })
  const headers = { 'content-type': 'application/gzip', 'content-encoding': 'gzip' }
  const response = await post('/v1/replays', outer.subarray(0, outer.length - 12), headers)
  expect(response.status).toBe(400)
  expect((await problemOf(response)).code).toBe('LOG_CORRUPT')
})

test('a body that is not what Content-Encoding says is damaged', async () => {
  const response = await post('/v1/replays', LOG, { ...CSV, 'content-encoding': 'gzip' })
  expect(response.status).toBe(400)
  expect((await problemOf(response)).code).toBe('LOG_CORRUPT')
})

test('other content encodings are refused, with the one that is taken', async () => {
  const response = await post('/v1/replays', LOG, { ...CSV, 'content-encoding': 'br' })
  expect(response.status).toBe(415)
  expect(response.headers.get('accept-encoding')).toBe('gzip')
  expect((await problemOf(response)).detail).toBe('Content-Encoding: expected gzip or none, got "br"')
})

test('a form carries a site file and several logs', async () => {
  const form = new FormData()
  form.set('site', JSON.stringify({ site: 'quern-hill', turbines: [{ turbine: 'Q01', ratedPowerKw: 2300 }] }))
  form.append('log', new Blob([LOG]), 'march.csv')
  form.append('log', new Blob([gzipSync(LOG)]), '../../etc/april.csv.gz')
  const response = await fetch(`${server.url}/v1/replays`, { method: 'POST', body: form })
  expect(response.status).toBe(201)
  const request = server.replays.requests[0]
  expect(request?.site.turbines?.[0]?.ratedPowerKw).toBe(2300)
  expect(request?.logs.map((log) => log.name)).toEqual(['march.csv', 'april.csv.gz'])
  expect(server.replays.bodies[0]?.[0]?.toString()).toBe(LOG)
})

test('a site file may come as a file part, after the log', async () => {
  const form = new FormData()
  form.append('log', new Blob([LOG]), 'march.csv')
  form.set('site', new Blob(['{"site":"quern-hill"}'], { type: 'application/json' }), 'farm.site.json')
  const response = await fetch(`${server.url}/v1/replays`, { method: 'POST', body: form })
  expect(response.status).toBe(201)
  expect(server.replays.requests[0]?.site).toEqual({ site: 'quern-hill' })
})

test('a site file that does not fit is refused with the place, and nothing is scored or kept', async () => {
  const form = new FormData()
  form.append('log', new Blob([LOG]), 'march.csv')
  form.set('site', '{"turbines":[{"turbine":"Q01","ratedPowerKw":"big"}]}')
  const response = await fetch(`${server.url}/v1/replays`, { method: 'POST', body: form })
  expect(response.status).toBe(422)
  const problem = await problemOf(response)
  expect(problem.code).toBe('BAD_SITE')
  expect(problem.detail).toContain('site.turbines[0].ratedPowerKw: expected a number')
  expect(server.replays.requests).toHaveLength(0)
  expect(await server.leftovers()).toEqual([])
})

test.each([
  ['no log', { site: '{}' }, 400, 'LOG_EMPTY'],
  ['an unknown part', { logs: LOG }, 400, 'BAD_REQUEST'],
  ['a site that is no JSON', { site: '{' }, 422, 'BAD_SITE'],
])('a form with %s is refused', async (_title, fields, status, code) => {
  const form = new FormData()
  for (const [name, value] of Object.entries(fields)) form.set(name, value)
  const response = await fetch(`${server.url}/v1/replays`, { method: 'POST', body: form })
  expect(response.status).toBe(status)
  expect((await problemOf(response)).code).toBe(code)
})

test('a form that ends within a part is refused and leaves nothing', async () => {
  const body = '--cut\r\nContent-Disposition: form-data; name="log"; filename="a.csv"\r\n\r\ntime,'
  const response = await post('/v1/replays', body, { 'content-type': 'multipart/form-data; boundary=cut' })
  expect(response.status).toBe(400)
  expect((await problemOf(response)).code).toBe('BAD_REQUEST')
  expect(await server.leftovers()).toEqual([])
})

test('options of the query override the settings of the service', async () => {
  const columns = encodeURIComponent('{"power":{"column":"P","unit":"W"}}')
  const query = `timezone=Europe/Berlin&stamp=end&columns=${columns}&turbine=Q01&startDate=2026-03-01&ratedPowerKw=2300.5&exponent=2.5&resamples=400&seed=7&assumeResponse=-0.3`
  expect((await post(`/v1/replays?${query}`, LOG)).status).toBe(201)
  const request = server.replays.requests[0]
  expect(request?.reading).toEqual({
    timezone: 'Europe/Berlin',
    stamp: 'end',
    columns: { power: { column: 'P', unit: 'W' } },
    turbine: 'Q01',
    startDate: '2026-03-01',
  })
  expect(request?.ratedPowerKw).toBe(2300.5)
  expect(request?.settings).toMatchObject({ exponent: 2.5, resamples: 400, seed: 7, minimumRows: 150 })
  expect(request?.settings.assumedResponsePctPerDeg).toBe(-0.3)
})

test.each([
  ['exponent=abc', 'exponent: expected a number from 0.5 up to 6, got "abc"'],
  ['exponent=NaN', 'exponent: expected a number from 0.5 up to 6, got "NaN"'],
  ['exponent=', 'exponent: expected a number from 0.5 up to 6, got ""'],
  ['exponent=2&exponent=3', 'exponent: expected a number from 0.5 up to 6, got ["2","3"]'],
  ['seed=1.5', 'seed: expected a whole number from 0 up to 4294967295, got "1.5"'],
  ['ratedPowerKw=0', 'ratedPowerKw: expected a number above 0 up to 50000, got 0'],
  ['stamp=middle', 'stamp: expected "begin" or "end", got "middle"'],
  ['columns=wind', 'columns: expected a JSON object, got "wind"'],
  ['columns={"vane":3}', 'columns.vane: expected text or an object, got 3'],
  ['columns=[]', 'columns: expected an object, got []'],
])('the query %s is refused with name, expected and got', async (query, detail) => {
  const response = await post(`/v1/replays?${encodeURI(query)}`, LOG)
  expect(response.status).toBe(400)
  expect(await problemOf(response)).toMatchObject({ code: 'BAD_OPTION', detail })
})

test('an unknown option is refused by its name', async () => {
  const response = await post('/v1/replays?exponnent=3', LOG)
  expect(response.status).toBe(400)
  expect((await problemOf(response)).detail).toMatch(
    /^exponnent: expected one of timezone, .*exponent.*, got an unknown name$/,
  )
})

test.each([
  ['an empty body', '', CSV],
  ['no body and no content type', null, {}],
])('%s is an empty log', async (_title, body, headers) => {
  const response = await post('/v1/replays', body, headers)
  expect(response.status).toBe(400)
  expect((await problemOf(response)).code).toBe('LOG_EMPTY')
  expect(await server.leftovers()).toEqual([])
})

test.each(['application/x-www-form-urlencoded', 'image/png'])(
  'a body of type %s is refused, with the types that are taken',
  async (type) => {
    const response = await post('/v1/replays', '{}', { 'content-type': type })
    expect(response.status).toBe(415)
    const problem = await problemOf(response)
    expect(problem.code).toBe('UNSUPPORTED_MEDIA_TYPE')
    expect(problem.detail).toContain('text/csv | text/plain')
    expect(problem.detail).toContain(`got "${type}"`)
  },
)

test('a content type with a charset is taken', async () => {
  expect((await post('/v1/replays', LOG, { 'content-type': 'text/csv; charset=utf-8' })).status).toBe(201)
})

test('an error of the replay is answered with its status, code and context, and the log is removed', async () => {
  server.replays.failure = new InputError('LOG_COLUMNS_MISSING', 'log: expected a column power, got none', {
    detail: { missing: ['power'] },
  })
  const response = await post('/v1/replays', LOG)
  expect(response.status).toBe(422)
  expect(await problemOf(response)).toMatchObject({
    code: 'LOG_COLUMNS_MISSING',
    context: { missing: ['power'] },
  })
  await eventually(async () => (await server.leftovers()).length === 0)
})

test('a fault of the program is answered without its words, its stack or a path', async () => {
  server.replays.failure = new Error(`cannot open ${server.dataFolder}/uploads/x`)
  const response = await post('/v1/replays', LOG)
  expect(response.status).toBe(500)
  const text = await response.text()
  expect(text).toContain('"code":"INTERNAL"')
  expect(text).not.toContain('cannot open')
  expect(text).not.toContain(server.dataFolder)
  expect(text).not.toContain('.ts')
})

test('a full disk is answered as such', async () => {
  server.replays.failure = Object.assign(new Error('write'), { code: 'ENOSPC' })
  const response = await post('/v1/replays', LOG)
  expect(response.status).toBe(507)
  expect((await problemOf(response)).code).toBe('STORAGE_FULL')
})

test('the path of the data folder never stands in an answer', async () => {
  server.replays.failure = new InputError('LOG_CORRUPT', `${server.dataFolder}/uploads/x: expected gzip`, {
    detail: { path: `${server.dataFolder}/uploads/x` },
  })
  expect(await (await post('/v1/replays', LOG)).text()).not.toContain(server.dataFolder)
})

test('a body larger than the limit by its own word is refused before it is sent', async () => {
  const socket = connect(server.port, '127.0.0.1')
  socket.write(
    'POST /v1/replays HTTP/1.1\r\nHost: x\r\nContent-Type: text/csv\r\nContent-Length: 1000001\r\nExpect: 100-continue\r\n\r\n',
  )
  const [answer] = (await once(socket, 'data')) as [Buffer]
  expect(answer.toString()).toMatch(/^HTTP\/1.1 413 /)
  expect(await server.leftovers()).toEqual([])
  socket.destroy()
})

test('a body at the limit is taken and one byte more is refused, with and without a declared length', async () => {
  const atLimit = Buffer.alloc(1_000_000, 'x')
  expect((await post('/v1/replays', atLimit)).status).toBe(201)
  const over = Buffer.alloc(1_000_001, 'x')
  const declared = await post('/v1/replays', over)
  expect(declared.status).toBe(413)
  expect((await problemOf(declared)).code).toBe('LOG_TOO_LARGE')
  const chunked = await fetch(`${server.url}/v1/replays`, {
    method: 'POST',
    headers: CSV,
    body: new Blob([over]).stream(),
    duplex: 'half',
  })
  expect(chunked.status).toBe(413)
  await eventually(async () => (await server.leftovers()).length === 0)
})

test('the parts of a form share one limit', async () => {
  const form = new FormData()
  for (const name of ['a.csv', 'b.csv']) form.append('log', new Blob([Buffer.alloc(600_000, 'x')]), name)
  const whole = new Response(form)
  const response = await fetch(`${server.url}/v1/replays`, {
    method: 'POST',
    // A stream has no declared length, so that only the count of bytes can tell.
    body: whole.body,
    headers: { 'content-type': whole.headers.get('content-type') ?? '' },
    duplex: 'half',
  })
  expect(response.status).toBe(413)
  expect((await problemOf(response)).code).toBe('LOG_TOO_LARGE')
  await eventually(async () => (await server.leftovers()).length === 0)
})

test.each([
  ['a plain body', 'Content-Type: text/csv\r\nContent-Length: 500\r\n\r\ntime,turbine\n'],
  [
    'a form',
    'Content-Type: multipart/form-data; boundary=b\r\nContent-Length: 500\r\n\r\n--b\r\nContent-Disposition: form-data; name="log"; filename="a.csv"\r\n\r\ntime,turb',
  ],
])('a client that breaks off %s leaves nothing behind', async (_title, head) => {
  const socket = connect(server.port, '127.0.0.1')
  socket.write(`POST /v1/replays HTTP/1.1\r\nHost: x\r\n${head}`)
  await eventually(async () => (await server.leftovers()).length === 1)
  socket.destroy()
  await eventually(async () => (await server.leftovers()).length === 0)
  expect(server.replays.requests).toHaveLength(0)
})

test('a client that goes silent is given up and leaves nothing behind', async () => {
  const socket = connect(server.port, '127.0.0.1')
  socket.on('error', () => undefined)
  socket.write(
    'POST /v1/replays HTTP/1.1\r\nHost: x\r\nContent-Type: text/csv\r\nContent-Length: 500\r\n\r\ntime',
  )
  await eventually(async () => (await server.leftovers()).length === 1)
  await once(socket, 'close')
  await eventually(async () => (await server.leftovers()).length === 0)
})

test('a score sheet that the client has is answered with 304 and no body', async () => {
  const tag = (await post('/v1/replays', LOG)).headers.get('etag') ?? ''
  const url = `${server.url}/v1/replays/replay-1`
  for (const header of [tag, `W/${tag}`, `"other", ${tag}`, '*']) {
    const response = await fetch(url, { headers: { 'if-none-match': header } })
    expect(response.status, header).toBe(304)
    expect(await response.text()).toBe('')
  }
  expect((await fetch(url, { headers: { 'if-none-match': '"other"' } })).status).toBe(200)
})

test('a replay that is not done answers its state and no sheet', async () => {
  server.replays.add({ id: 'slow', state: 'running' })
  server.replays.add({
    id: 'bad',
    state: 'failed',
    finishedMs: 5_000,
    problem: { code: 'LOG_TIME', detail: 'time: expected stamps, got text' },
  })
  const slow = await (await fetch(`${server.url}/v1/replays/slow`)).json()
  expect(slow).toEqual({
    replay: 'slow',
    progress: null,
    state: 'running',
    site: null,
    createdAt: '1970-01-01T00:00:01.000Z',
    finishedAt: null,
    problem: null,
    href: '/v1/replays/slow',
  })
  const bad = await (await fetch(`${server.url}/v1/replays/bad`)).json()
  expect(bad).toMatchObject({ state: 'failed', problem: { code: 'LOG_TIME' } })
})

test('the list gives every replay once, page by page', async () => {
  for (const id of ['a', 'b', 'c', 'd', 'e']) server.replays.add({ id })
  const seen: string[] = []
  let after: string | null = ''
  while (after !== null) {
    const query: string = after === '' ? 'limit=2' : `limit=2&after=${after}`
    const page = (await (await fetch(`${server.url}/v1/replays?${query}`)).json()) as {
      replays: { replay: string }[]
      next: string | null
    }
    seen.push(...page.replays.map((one) => one.replay))
    after = page.next
  }
  expect(seen).toEqual(['a', 'b', 'c', 'd', 'e'])
})

test('a removed replay is gone, and removing it again says so', async () => {
  await post('/v1/replays', LOG)
  const url = `${server.url}/v1/replays/replay-1`
  expect((await fetch(url, { method: 'DELETE' })).status).toBe(204)
  expect((await fetch(url)).status).toBe(404)
  const again = await fetch(url, { method: 'DELETE' })
  expect(again.status).toBe(404)
  expect((await problemOf(again)).code).toBe('REPLAY_NOT_FOUND')
})
