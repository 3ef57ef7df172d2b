import { expect, test } from 'vitest'
import { checkSite, createSetup, parseSite } from '../../src/setup/index.ts'
import { makeFolder, openTestStore } from '../store/folder.ts'

const SITE = {
  site: 'quern-hill',
  timezone: 'Europe/Berlin',
  turbines: [{ turbine: 'Q01', ratedPowerKw: 2300, vane: { logged: 'afterCorrection', correctionDeg: 0.5 } }],
  corrections: [{ turbine: 'Q01', at: '2026-03-02T10:00:00Z', enteredDeg: 6 }],
}

test('a site file comes back as it was put, also after a restart', async () => {
  const folder = await makeFolder()
  const store = await openTestStore(folder)
  const setup = createSetup(store)
  expect(await setup.putSite('quern-hill', SITE)).toEqual({ file: SITE, isNew: true })
  expect((await setup.putSite('quern-hill', SITE)).isNew).toBe(false)
  await store.close()
  expect(await createSetup(await openTestStore(folder)).getSite('quern-hill')).toEqual(SITE)
})

test('a site file that does not fit is refused with place, expected and got, and the older one stays', async () => {
  const setup = createSetup(await openTestStore(await makeFolder()))
  await setup.putSite('quern-hill', SITE)
  const cases: [unknown, RegExp][] = [
    [
      { turbines: [{ turbine: 'Q01', ratedPowerKw: -1 }] },
      /^site\.turbines\[0\]\.ratedPowerKw: expected .*got -1/,
    ],
    [
      { turbines: [{ turbine: 'Q01' }, { turbine: 'Q01' }] },
      /^site\.turbines\[1\]\.turbine: expected .*got "Q01" again/,
    ],
    [{ timezone: 'Europe/Nowhere' }, /^site\.timezone: expected .*got "Europe\/Nowhere"/],
    [{ turbine: [] }, /^site\.turbine: expected .*got an unknown name/],
    [{ site: 'mill-moor' }, /^site\.site: expected "quern-hill".*got "mill-moor"/],
    [
      { exclude: [{ from: '2026-03-02T00:00:00Z', to: '2026-03-02T00:00:00Z' }] },
      /^site\.exclude\[0\]\.to: expected/,
    ],
    [
      { corrections: [{ turbine: 'Q01', at: 'yesterday', enteredDeg: 6 }] },
      /^site\.corrections\[0\]\.at: expected/,
    ],
    [[], /^site: expected an object/],
  ]
  for (const [value, message] of cases) {
    await expect(setup.putSite('quern-hill', value), JSON.stringify(value)).rejects.toThrow(
      expect.objectContaining({
        code: 'BAD_SITE',
        message: expect.stringMatching(message) as string,
      }) as Error,
    )
  }
  await expect(setup.putSite('a/b', {})).rejects.toThrow(
    expect.objectContaining({ code: 'BAD_SITE' }) as Error,
  )
  expect(await setup.getSite('quern-hill')).toEqual(SITE)
})

test('a site file reads the same with a byte order mark, and text that is no JSON is named', () => {
  expect(parseSite(`\uFEFF${JSON.stringify(SITE)}`, 'site')).toEqual(checkSite(SITE, 'site'))
  expect(() => parseSite('{', 'farm.json')).toThrow(
    expect.objectContaining({
      code: 'BAD_SITE',
      message: expect.stringMatching(/^farm\.json: expected JSON/) as string,
    }) as Error,
  )
})

test('a turbine is added, replaced and removed without touching the others', async () => {
  const setup = createSetup(await openTestStore(await makeFolder()))
  await setup.putSite('quern-hill', SITE)
  expect(await setup.putTurbine('quern-hill', 'Q02', { model: 'M1' })).toEqual({
    setup: { turbine: 'Q02', model: 'M1' },
    isNew: true,
  })
  expect((await setup.putTurbine('quern-hill', 'Q02', { turbine: 'Q02', hubHeightM: 90 })).isNew).toBe(false)
  expect((await setup.getSite('quern-hill')).turbines).toEqual([
    ...SITE.turbines,
    { turbine: 'Q02', hubHeightM: 90 },
  ])
  await setup.removeTurbine('quern-hill', 'Q01')
  expect((await setup.getSite('quern-hill')).turbines).toEqual([{ turbine: 'Q02', hubHeightM: 90 }])
  expect(await setup.getTurbine('quern-hill', 'Q02')).toEqual({ turbine: 'Q02', hubHeightM: 90 })
})

test('turbines that are put at the same time are all kept', async () => {
  const setup = createSetup(await openTestStore(await makeFolder()))
  await setup.putSite('quern-hill', {})
  const names = Array.from({ length: 10 }, (_, i) => `Q${i}`)
  await Promise.all(names.map((name) => setup.putTurbine('quern-hill', name, {})))
  const { turbines } = await setup.getSite('quern-hill')
  expect(turbines?.map(({ turbine }) => turbine).sort()).toEqual(names)
})

test('sites and turbines that are not there are named as such', async () => {
  const setup = createSetup(await openTestStore(await makeFolder()))
  await setup.putSite('quern-hill', SITE)
  const noSite = expect.objectContaining({ code: 'SITE_NOT_FOUND' }) as Error
  const noTurbine = expect.objectContaining({ code: 'TURBINE_NOT_FOUND' }) as Error
  const bad = expect.objectContaining({ code: 'BAD_SITE' }) as Error
  await expect(setup.getSite('x')).rejects.toThrow(noSite)
  await expect(setup.removeSite('x')).rejects.toThrow(noSite)
  await expect(setup.putTurbine('x', 'Q01', {})).rejects.toThrow(noSite)
  await expect(setup.getTurbine('quern-hill', 'Q09')).rejects.toThrow(noTurbine)
  await expect(setup.removeTurbine('quern-hill', 'Q09')).rejects.toThrow(noTurbine)
  await expect(setup.putTurbine('quern-hill', 'Q02', { turbine: 'Q03' })).rejects.toThrow(bad)
  await expect(setup.putTurbine('quern-hill', 'Q02', 7)).rejects.toThrow(bad)
})

test('sites are listed by name, page by page, and a removed one is gone', async () => {
  const setup = createSetup(await openTestStore(await makeFolder()))
  for (const site of ['c', 'a', 'B', 'b']) await setup.putSite(site, {})
  expect(await setup.listSites({ limit: 3 })).toEqual({ sites: ['B', 'a', 'b'], next: 'b' })
  expect(await setup.listSites({ limit: 3, after: 'b' })).toEqual({ sites: ['c'], next: null })
  await setup.removeSite('a')
  expect((await setup.listSites({ limit: 10 })).sites).toEqual(['B', 'b', 'c'])
})
