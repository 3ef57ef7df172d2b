import { setTimeout as wait } from 'node:timers/promises'
import { afterEach, beforeEach, expect, test } from 'vitest'
import { codeOf } from './json-calls.ts'
import { startServer, type StartedServer } from './started-server.ts'

let server: StartedServer
/** Lets one replay that runs come to its end. */
let finish: (() => void)[]
let begun: number

beforeEach(async () => {
  finish = []
  begun = 0
  server = await startServer({
    gate: { atOnce: 1, waiting: 1 },
    replayCounts: () => Promise.resolve({ queued: 2, done: 5 }),
  })
  const scoring = server.replays.oneShot.bind(server.replays)
  server.replays.oneShot = async (request) => {
    begun++
    await new Promise<void>((resolve) => finish.push(resolve))
    return await scoring(request)
  }
})
afterEach(async () => {
  for (const one of finish) one()
  await server.stop()
})

function post(signal?: AbortSignal) {
  return fetch(`${server.url}/v1/replays`, {
    method: 'POST',
    body: 'time\n1\n',
    headers: { 'content-type': 'text/csv' },
    ...(signal === undefined ? {} : { signal }),
  })
}

async function metric(line: string): Promise<number> {
  const text = await (await fetch(`${server.url}/metrics`)).text()
  const found = text.split('\n').find((one) => one.startsWith(`${line} `))
  return found === undefined ? NaN : Number(found.slice(line.length + 1))
}

async function until(check: () => Promise<boolean> | boolean): Promise<void> {
  for (let i = 0; i < 200 && !(await check()); i++) await wait(10)
  expect(await check()).toBe(true)
}

test('one log is scored, one waits, and the next is told to come back', async () => {
  const first = post()
  await until(() => begun === 1)
  const second = post()
  await until(async () => (await metric('yawledger_uploads_waiting')) === 1)
  expect(begun).toBe(1)
  const third = await post()
  expect(third.headers.get('retry-after')).toBe('30')
  expect(await codeOf(third)).toBe('503 BUSY')
  finish[0]?.()
  expect((await first).status).toBe(201)
  await until(() => begun === 2)
  finish[1]?.()
  expect((await second).status).toBe(201)
  const fourth = post()
  await until(() => begun === 3)
  finish[2]?.()
  expect((await fourth).status).toBe(201)
})

test('a client that goes away while it waits is not scored, and its place is free again', async () => {
  const first = post()
  await until(() => begun === 1)
  const gone = new AbortController()
  const second = post(gone.signal).catch(() => 'gone')
  await until(async () => (await metric('yawledger_uploads_waiting')) === 1)
  gone.abort()
  expect(await second).toBe('gone')
  await wait(50) // the server learns of it by a packet of its own
  finish[0]?.()
  expect((await first).status).toBe(201)
  await until(async () => (await server.leftovers()).length === 0)
  expect(begun).toBe(1)
})

test('a client that goes away while it is scored leaves a replay and a service that works', async () => {
  const gone = new AbortController()
  const first = post(gone.signal).catch(() => 'gone')
  await until(() => begun === 1)
  gone.abort()
  expect(await first).toBe('gone')
  finish[0]?.()
  await until(() => server.replays.records.has('replay-1'))
  await until(async () => (await server.leftovers()).length === 0)
  const second = post()
  await until(() => begun === 2)
  finish[1]?.()
  expect((await second).status).toBe(201)
})

test('metrics count rows, requests by route and replays by state, and name no address', async () => {
  const first = post()
  await until(() => begun === 1)
  finish[0]?.()
  await first
  await fetch(`${server.url}/v1/replays/secret-name`)
  await fetch(`${server.url}/secret-address`)
  // The rows of the made-up sheet.
  expect(await metric('yawledger_log_rows_total{outcome="received"}')).toBe(4464)
  expect(await metric('yawledger_log_rows_total{outcome="accepted"}')).toBe(4460)
  expect(await metric('yawledger_log_rows_total{outcome="rejected"}')).toBe(3)
  expect(await metric('yawledger_replays{state="queued"}')).toBe(2)
  expect(await metric('yawledger_replays{state="failed"}')).toBe(0)
  const count = 'yawledger_http_request_duration_seconds_count'
  expect(await metric(`${count}{method="POST",route="/v1/replays",status="201"}`)).toBe(1)
  expect(await metric(`${count}{method="GET",route="/v1/replays/:id",status="404"}`)).toBe(1)
  expect(await metric(`${count}{method="GET",route="unknown",status="404"}`)).toBe(1)
  const response = await fetch(`${server.url}/metrics`)
  expect(response.headers.get('content-type')).toMatch(/^text\/plain; version=0\.0\.4/)
  const text = await response.text()
  expect(text).toContain('process_cpu_seconds_total')
  expect(text).not.toMatch(/secret|tmp/)
})
