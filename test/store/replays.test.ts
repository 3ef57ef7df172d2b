import { expect, test } from 'vitest'
import type { ReplayRecord } from '../../src/replay/contract.ts'
import type { StoredReplay } from '../../src/store/index.ts'
import { makeFolder, openTestStore } from './folder.ts'

test('a finished replay comes back byte for byte after a restart', async () => {
  const folder = await makeFolder()
  const sheet = '{"b":1.50,  "a":"ü\\u0000 \\n"}'
  const first = await openTestStore(folder)
  await first.replays.begin({ id: 'r1', site: 'quern-hill', createdMs: 1_772_323_200_123 })
  await first.replays.finish('r1', sheet, 1_772_323_200_999)
  await first.close()
  const second = await openTestStore(folder)
  // Assigned, so that the compiler holds the two shapes together.
  const record: Omit<ReplayRecord, 'progress'> | undefined = await second.replays.get('r1')
  expect(record).toEqual({
    id: 'r1',
    state: 'done',
    site: 'quern-hill',
    createdMs: 1_772_323_200_123,
    finishedMs: 1_772_323_200_999,
    sheet,
    problem: null,
  } satisfies StoredReplay)
})

test('a replay that waits gets its turn once, and keeps what it was made with until it is removed', async () => {
  const store = await openTestStore(await makeFolder())
  const notRunning: unknown = expect.objectContaining({ code: 'REPLAY_NOT_FOUND' })
  await store.replays.begin({ id: 'r1', site: 'quern-hill', createdMs: 5, state: 'queued' })
  expect(await store.replays.get('r1')).toMatchObject({ state: 'queued' })
  await store.replays.run('r1')
  expect(await store.replays.get('r1')).toMatchObject({ state: 'running' })
  await expect(store.replays.run('r1')).rejects.toThrow(notRunning)
  await store.replays.finish('r1', '{}', 6, '{"site":{}}')
  expect(await store.replays.request('r1')).toBe('{"site":{}}')
  await store.replays.remove('r1')
  expect(await store.replays.request('r1')).toBeUndefined()
  await store.replays.begin({ id: 'r2', site: null, createdMs: 5, state: 'queued' })
  await store.replays.cancel('r2')
  await expect(store.replays.run('r2')).rejects.toThrow(notRunning)
})

test('a running replay is running, and failed with INTERRUPTED after a restart', async () => {
  const folder = await makeFolder()
  const first = await openTestStore(folder)
  await first.replays.begin({ id: 'r1', site: null, createdMs: 5 })
  expect(await first.replays.get('r1')).toMatchObject({ state: 'running', finishedMs: null, sheet: null })
  await first.close()
  const second = await openTestStore(folder, { clock: () => 77 })
  expect(await second.replays.get('r1')).toMatchObject({
    state: 'failed',
    finishedMs: 77,
    problem: { code: 'INTERRUPTED' },
  })
})

test('a replay ends once', async () => {
  const { replays } = await openTestStore(await makeFolder())
  const notFound = expect.objectContaining({ code: 'REPLAY_NOT_FOUND' }) as unknown
  await expect(replays.finish('r1', '{}', 1)).rejects.toThrow(notFound)
  await replays.begin({ id: 'r1', site: null, createdMs: 5 })
  await replays.fail('r1', { code: 'LOG_EMPTY', detail: 'log: expected rows, got none' })
  await expect(replays.finish('r1', '{}', 1)).rejects.toThrow(notFound)
  await expect(replays.cancel('r1')).rejects.toThrow(notFound)
  expect(await replays.get('r1')).toMatchObject({
    state: 'failed',
    finishedMs: 1_000,
    sheet: null,
    problem: { code: 'LOG_EMPTY', detail: 'log: expected rows, got none' },
  })
})

test('a removed replay is gone and its id is free', async () => {
  const { replays } = await openTestStore(await makeFolder())
  await replays.begin({ id: 'r1', site: null, createdMs: 5 })
  await replays.finish('r1', '"one"', 6)
  expect(await replays.remove('r1')).toBe(true)
  expect(await replays.remove('r1')).toBe(false)
  expect(await replays.get('r1')).toBeUndefined()
  await replays.begin({ id: 'r1', site: null, createdMs: 7 })
  await replays.finish('r1', '"two"', 8)
  expect((await replays.get('r1'))?.sheet).toBe('"two"')
})

test('pages go from newest to oldest and hold every replay once, also at equal times', async () => {
  const { replays } = await openTestStore(await makeFolder())
  const created = [5, 9, 9, 9, 1, 7, 9]
  for (const [i, createdMs] of created.entries()) await replays.begin({ id: `r${i}`, site: null, createdMs })
  const seen: string[] = []
  let after: string | undefined
  do {
    const page = await replays.list({ limit: 2, ...(after === undefined ? {} : { after }) })
    expect(page.replays.length).toBeLessThanOrEqual(2)
    seen.push(...page.replays.map(({ id }) => id))
    after = page.next ?? undefined
  } while (after !== undefined)
  expect(seen).toEqual(['r6', 'r3', 'r2', 'r1', 'r5', 'r0', 'r4'])
})

test('a list leaves the sheets out when they are not asked for', async () => {
  const { replays } = await openTestStore(await makeFolder())
  await replays.begin({ id: 'r1', site: null, createdMs: 5 })
  await replays.finish('r1', '{}', 6)
  expect((await replays.list({ limit: 1 })).replays[0]?.sheet).toBe('{}')
  expect((await replays.list({ limit: 1, sheets: false })).replays[0]).toMatchObject({
    state: 'done',
    sheet: null,
  })
})

test('a cursor that no page gave and a limit out of range are the mistake of the caller', async () => {
  const { replays } = await openTestStore(await makeFolder())
  const bad = expect.objectContaining({ code: 'BAD_REQUEST' }) as unknown
  for (const after of ['', 'x', Buffer.from('1 ../../x').toString('base64url')]) {
    await expect(replays.list({ after, limit: 1 }), after).rejects.toThrow(bad)
  }
  for (const limit of [0, 1001, 1.5, NaN]) await expect(replays.list({ limit })).rejects.toThrow(bad)
})

test('writes that come at once are all kept', async () => {
  const { replays } = await openTestStore(await makeFolder())
  await Promise.all(
    Array.from({ length: 40 }, async (_, i) => {
      await replays.begin({ id: `r${i}`, site: null, createdMs: i })
      await replays.finish(`r${i}`, `${i}`, i)
    }),
  )
  const { replays: all } = await replays.list({ limit: 100 })
  expect(all.map(({ sheet }) => sheet)).toEqual(Array.from({ length: 40 }, (_, i) => `${39 - i}`))
})
