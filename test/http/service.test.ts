import { once } from 'node:events'
import { connect } from 'node:net'
import supertest from 'supertest'
import { afterEach, beforeEach, expect, test } from 'vitest'
import { startServer, type StartedServer } from './started-server.ts'

let server: StartedServer
let ready: () => Promise<void>

beforeEach(async () => {
  ready = () => Promise.resolve()
  server = await startServer({ ready: () => ready() })
})
afterEach(async () => {
  await server.stop()
})

test('health answers whether the process runs and whether it can take work', async () => {
  await supertest(server.url).get('/health/live').expect(200, { status: 'live' })
  await supertest(server.url).get('/health/ready').expect(200, { status: 'ready' })
  ready = () => Promise.reject(new Error('data folder /secret is read-only'))
  const refused = await supertest(server.url).get('/health/ready').expect(503)
  expect(refused.body).toMatchObject({ code: 'NOT_READY', status: 503 })
  expect(refused.headers['retry-after']).toBe('5')
  expect(refused.text).not.toContain('/secret')
  await supertest(server.url).get('/health/live').expect(200)
})

test('an unknown address is 404, and a wrong method 405 with those that are right', async () => {
  const unknown = await supertest(server.url).get('/v2/replays').expect(404)
  expect(unknown.body).toMatchObject({ code: 'NOT_FOUND', instance: '/v2/replays' })
  const wrong = await supertest(server.url).put('/v1/replays').expect(405)
  expect(wrong.body).toMatchObject({ code: 'METHOD_NOT_ALLOWED' })
  expect(wrong.headers['allow']).toBe('GET, HEAD, POST')
  const onOne = await supertest(server.url).patch('/v1/replays/x').expect(405)
  expect(onOne.headers['allow']).toBe('DELETE, GET, HEAD')
})

test('a sane request id is kept and echoed, any other is replaced', async () => {
  const kept = await supertest(server.url).get('/v1/replays/none').set('x-request-id', 'job-17.b')
  expect(kept.headers['x-request-id']).toBe('job-17.b')
  expect(kept.body).toMatchObject({ requestId: 'job-17.b' })
  for (const given of ['two words', '<b>', 'x'.repeat(101)]) {
    const replaced = await supertest(server.url).get('/health/live').set('x-request-id', given)
    expect(replaced.headers['x-request-id']).toMatch(/^[0-9a-f-]{36}$/)
  }
})

test('an address that cannot be decoded is the mistake of the caller', async () => {
  const response = await supertest(server.url).get('/v1/replays/%zz').expect(400)
  expect(response.headers['content-type']).toBe('application/problem+json')
  expect(response.body).toMatchObject({ code: 'BAD_REQUEST' })
})

test('bytes that are no HTTP are answered with a problem and a closed connection', async () => {
  const socket = connect(server.port, '127.0.0.1')
  socket.write('hello\r\n\r\n')
  const [answer] = (await once(socket, 'data')) as [Buffer]
  expect(answer.toString()).toMatch(/^HTTP\/1.1 400 [^]*"code":"BAD_REQUEST"/)
  await once(socket, 'close')
})

test.each(['limit=0', 'limit=201', 'limit=x', 'page=2'])('the list refuses ?%s', async (query) => {
  const response = await supertest(server.url).get(`/v1/replays?${query}`).expect(400)
  expect(response.body).toMatchObject({ code: 'BAD_OPTION' })
})

test('a number that is not known is answered as null and not as 0', () => {
  const serialize = server.app.serializerCompiler?.({
    schema: { type: 'object', properties: { x: { type: 'number' } } },
    method: 'GET',
    url: '/',
    httpStatus: '200',
  })
  expect(serialize?.({ x: null, y: NaN, z: Infinity })).toBe('{"x":null,"y":null,"z":null}')
})

test('a service that is closing lets the running request finish and refuses new ones', async () => {
  let finish: () => void = () => undefined
  let started: () => void = () => undefined
  const running = new Promise<void>((resolve) => (started = resolve))
  const scoring = server.replays.oneShot.bind(server.replays)
  server.replays.oneShot = async (request) => {
    started()
    await new Promise<void>((resolve) => (finish = resolve))
    return await scoring(request)
  }
  // The second request comes by the connection that the first one keeps open, once the service closes.
  const socket = connect(server.port, '127.0.0.1')
  let answers = ''
  socket.on('data', (bytes: Buffer) => (answers += bytes.toString()))
  socket.write(
    'POST /v1/replays HTTP/1.1\r\nHost: x\r\nContent-Type: text/csv\r\nContent-Length: 7\r\n\r\ntime\n1\n',
  )
  await running
  const closed = server.app.close()
  socket.write('GET /v1/replays HTTP/1.1\r\nHost: x\r\n\r\n')
  await new Promise((resolve) => setImmediate(resolve))
  finish()
  await Promise.all([once(socket, 'close'), closed])
  expect(answers).toMatch(/^HTTP\/1.1 201 /)
  expect(answers).toMatch(/HTTP\/1.1 503 [^]*"code":"NOT_READY"/)
}, 10_000)
