import { afterEach, beforeEach, expect, test } from 'vitest'
import { codeOf, jsonCalls } from './json-calls.ts'
import { startServerOnStore, type ServerOnStore } from './started-server.ts'

let server: ServerOnStore
const { put, post, get, remove } = jsonCalls(() => server.url)

beforeEach(async () => {
  server = await startServerOnStore({ inMemory: true })
})
afterEach(async () => {
  await server.stop()
})

const SITE = {
  timezone: 'Europe/Berlin',
  turbines: [{ turbine: 'Q01', ratedPowerKw: 2300 }],
  exclude: [{ from: '2026-03-01T00:00:00Z', to: '2026-03-02T00:00:00Z' }],
}

test('a site file is kept whole, read again, replaced and removed', async () => {
  const first = await put('/v1/sites/quern-hill', SITE)
  expect(first.status).toBe(201)
  expect(first.headers.get('location')).toBe('/v1/sites/quern-hill')
  expect(await first.json()).toEqual({ ...SITE, site: 'quern-hill' })
  const read = await get('/v1/sites/quern-hill')
  expect(await read.json()).toEqual({ ...SITE, site: 'quern-hill' })
  expect(read.headers.get('etag')).toBe(first.headers.get('etag'))
  const again = await put('/v1/sites/quern-hill', { ...SITE, timezone: 'UTC' })
  expect(again.status).toBe(200)
  expect(again.headers.get('etag')).not.toBe(first.headers.get('etag'))
  expect((await remove('/v1/sites/quern-hill')).status).toBe(204)
  expect(await codeOf(await get('/v1/sites/quern-hill'))).toBe('404 SITE_NOT_FOUND')
  expect(await codeOf(await remove('/v1/sites/quern-hill'))).toBe('404 SITE_NOT_FOUND')
})

test('a site file that is at hand is answered with 304', async () => {
  const etag = (await put('/v1/sites/quern-hill', SITE)).headers.get('etag') ?? ''
  const same = await get('/v1/sites/quern-hill', { 'if-none-match': etag })
  expect(same.status).toBe(304)
  expect(await same.text()).toBe('')
})

test('a name of letters that an address must encode is one name everywhere', async () => {
  const name = 'Mühle & Söhne 风场'
  const address = `/v1/sites/${encodeURIComponent(name)}`
  const response = await put(address, {})
  expect(response.headers.get('location')).toBe(address)
  expect(await (await get(address)).json()).toEqual({ site: name })
  // Nine bytes a letter: an address may be longer than the name.
  const long = '风'.repeat(100)
  expect((await put(`/v1/sites/${encodeURIComponent(long)}`, {})).status).toBe(201)
  expect(await codeOf(await put(`/v1/sites/${'x'.repeat(101)}`, {}))).toBe('400 BAD_OPTION')
})

test.each(
  [
    ['of another name', '{"site":"other"}', '422 BAD_SITE'],
    ['with a turbine twice', '{"turbines":[{"turbine":"A"},{"turbine":"A"}]}', '422 BAD_SITE'],
    ['in an unknown zone', '{"timezone":"Mars/Base"}', '422 BAD_SITE'],
    ['that breaks off', '{"turbine', '400 BAD_REQUEST'],
    ['of no bytes', '', '400 BAD_REQUEST'],
    ['beyond 8 MB', `{"note":"${'x'.repeat(8_000_001)}"}`, '413 BODY_TOO_LARGE'],
  ].map(([title, body, expected]) => ({ title, expected, body: () => body ?? '' })),
)('a site file $title is refused: $expected', async ({ body, expected }) => {
  expect(await codeOf(await put('/v1/sites/quern-hill', body()))).toBe(expected)
  expect(await codeOf(await get('/v1/sites/quern-hill'))).toBe('404 SITE_NOT_FOUND')
})

test('a site file of another type is refused with the type that is taken', async () => {
  const response = await fetch(`${server.url}/v1/sites/quern-hill`, {
    method: 'PUT',
    body: '{}',
    headers: { 'content-type': 'text/csv' },
  })
  expect(response.status).toBe(415)
  expect(await response.text()).toContain('expected application/json, got \\"text/csv\\"')
})

test('sites are listed once each, page by page', async () => {
  for (const name of ['b', 'a', 'c']) await put(`/v1/sites/${name}`, {})
  const seen: string[] = []
  let after = ''
  for (let pages = 0; pages < 3; pages++) {
    const response = await get(`/v1/sites?limit=2${after}`)
    const page = (await response.json()) as { sites: { site: string; href: string }[]; next: string | null }
    seen.push(...page.sites.map(({ href }) => href))
    if (page.next === null) break
    after = `&after=${encodeURIComponent(page.next)}`
  }
  expect(seen).toEqual(['/v1/sites/a', '/v1/sites/b', '/v1/sites/c'])
})

test('a turbine is set up within its site, and the name in the address counts', async () => {
  const path = '/v1/sites/quern-hill/turbines/Q02'
  expect(await codeOf(await put(path, {}))).toBe('404 SITE_NOT_FOUND')
  await put('/v1/sites/quern-hill', SITE)
  const added = await put(path, { ratedPowerKw: 3000 })
  expect(added.status).toBe(201)
  expect(added.headers.get('location')).toBe(path)
  expect(await added.json()).toEqual({ turbine: 'Q02', ratedPowerKw: 3000 })
  expect((await put(path, { turbine: 'Q02', hubHeightM: 90 })).status).toBe(200)
  expect(await codeOf(await put(path, { turbine: 'Q03' }))).toBe('422 BAD_SITE')
  expect(await (await get(path)).json()).toEqual({ turbine: 'Q02', hubHeightM: 90 })
  expect((await remove(path)).status).toBe(204)
  expect(await codeOf(await get(path))).toBe('404 TURBINE_NOT_FOUND')
})

const ENTRIES = {
  corrections: [
    { turbine: 'Q01', at: '2026-04-02T00:00:00Z', enteredDeg: 6 },
    { turbine: 'Q01', at: '2026-03-02T00:00:00+02:00', enteredDeg: -2, note: 'trial' },
  ],
  events: [
    { at: '2026-04-02T00:00:00Z', kind: 'controller software' },
    { turbine: 'Q01', at: '2026-03-02T00:00:00Z', kind: 'vane replaced' },
  ],
  exclude: [
    { from: '2026-04-02T00:00:00Z', to: '2026-04-03T00:00:00Z', reason: 'grid tests' },
    { from: '2026-03-02T00:00:00Z', to: '2026-03-03T00:00:00Z' },
  ],
}

test.each(['corrections', 'events', 'exclude'] as const)(
  '%s are added one by one, kept in the order of time, told once, and removed by their id',
  async (list) => {
    const path = `/v1/sites/quern-hill/${list}`
    const [late, early] = ENTRIES[list]
    expect(await codeOf(await post(path, late))).toBe('404 SITE_NOT_FOUND')
    await put('/v1/sites/quern-hill', {})
    const added = await post(path, late)
    expect(added.status).toBe(201)
    const { id } = (await added.json()) as { id: string }
    expect(added.headers.get('location')).toBe(`${path}/${id}`)
    await post(path, early)
    // The same names in another order say the same.
    const again = await post(path, Object.fromEntries(Object.entries(late ?? {}).reverse()))
    expect(again.status).toBe(200)
    const listed = (await (await get(path)).json()) as Record<string, { id: string }[]>
    // What became of a correction stands beside it once a replay holds its time.
    const judged = list === 'corrections' ? { proof: null } : {}
    expect(listed[list]?.map((entry) => ({ ...entry, id: '' }))).toEqual([
      { ...early, id: '', ...judged },
      { ...late, id: '', ...judged },
    ])
    // Ids are no part of the site file: it can be put again as it is read.
    const file = (await (await get('/v1/sites/quern-hill')).json()) as Record<string, unknown>
    expect(file[list]).toEqual([early, late])
    expect((await put('/v1/sites/quern-hill', file)).status).toBe(200)
    expect((await remove(`${path}/${id}`)).status).toBe(204)
    expect(await codeOf(await remove(`${path}/${id}`))).toBe('404 ENTRY_NOT_FOUND')
    expect(((await (await get(path)).json()) as Record<string, unknown[]>)[list]).toHaveLength(1)
  },
)

test('an entry that does not fit leaves the site as it was', async () => {
  await put('/v1/sites/quern-hill', {})
  const path = '/v1/sites/quern-hill/exclude'
  const backwards = { from: '2026-04-03T00:00:00Z', to: '2026-04-02T00:00:00Z' }
  expect(await codeOf(await post(path, backwards))).toBe('422 BAD_SITE')
  expect(await codeOf(await post(path, { from: 'soon' }))).toBe('422 BAD_SITE')
  expect(await (await get(path)).json()).toEqual({ exclude: [] })
})

test('entries that are added at the same time are all kept', async () => {
  await put('/v1/sites/quern-hill', {})
  const days = Array.from({ length: 12 }, (_, day) => `2026-03-${String(day + 1).padStart(2, '0')}T00:00:00Z`)
  await Promise.all(days.map((at) => post('/v1/sites/quern-hill/events', { at, kind: 'blade work' })))
  const { events } = (await (await get('/v1/sites/quern-hill/events')).json()) as { events: { at: string }[] }
  expect(events.map(({ at }) => at)).toEqual(days)
})
