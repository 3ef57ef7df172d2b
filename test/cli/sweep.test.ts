import { expect, test } from 'vitest'
import { InputError } from '../../src/errors.ts'
import type { Setup } from '../../src/setup/index.ts'
import type { SiteFile } from '../../src/sheet/index.ts'
import { ReplaysInMemory } from '../http/replays-in-memory.ts'
import { sheetExample } from '../http/sheet-example.ts'
import { runCli } from './run-cli.ts'

/** Sites by name, of which one page holds two. */
function setupOf(files: Record<string, SiteFile>): Setup {
  const names = Object.keys(files).sort()
  return {
    getSite: (site: string) =>
      files[site] === undefined
        ? Promise.reject(new InputError('SITE_NOT_FOUND', `site: expected one that was put, got "${site}"`))
        : Promise.resolve(files[site]),
    listSites: ({ after = '' }: { after?: string }) => {
      const rest = names.filter((name) => name > after)
      return Promise.resolve({ sites: rest.slice(0, 2), next: rest.length > 2 ? (rest[1] ?? null) : null })
    },
  } as unknown as Setup
}

function aligned() {
  return { ...sheetExample('quiet'), worklist: [] }
}

test('a month is that of each site, and a sweep that finds somebody to climb ends with 10', async () => {
  const setup = setupOf({ a: { timezone: 'Europe/Berlin' }, b: {}, c: { timezone: 'Asia/Kolkata' } })
  const replays = new ReplaysInMemory()
  replays.sheets.splice(0, 1, aligned(), sheetExample('climb'), aligned())
  const args = ['sweep', '--all', '--month', '2026-03', '--data', '/srv/yaw', '--threshold', '4']
  const ran = await runCli(args, { setup, replays })
  expect(ran.err).toBe('')
  expect(ran.status).toBe(10)
  // Berlin leaves March in summer time, two hours ahead of UTC; Kolkata is five and a half ahead all year.
  expect(
    replays.stores.map(({ site, fromMs, toMs }) => [
      site,
      new Date(fromMs).toISOString(),
      new Date(toMs).toISOString(),
    ]),
  ).toEqual([
    ['a', '2026-02-28T23:00:00.000Z', '2026-03-31T22:00:00.000Z'],
    ['b', '2026-03-01T00:00:00.000Z', '2026-04-01T00:00:00.000Z'],
    ['c', '2026-02-28T18:30:00.000Z', '2026-03-31T18:30:00.000Z'],
  ])
  expect(ran.out).toContain('Worklist of a, ')
  expect(ran.out).toContain('No turbine was found to stand off the wind.')
  expect(ran.out).toMatch(/Worklist of b, [^]*1\. Q01\n {3}misalignment m: \+6\.1 degrees/)
  expect(ran.settings[0]).toEqual({
    dataFolder: { flag: '--data', value: '/srv/yaw' },
    actionThresholdDeg: { flag: '--threshold', value: '4' },
  })
  expect(ran.closed).toBe(1)
})

test('a sweep with nothing to do ends with 0, and a turbine of the site that was not scored is named', async () => {
  const replays = new ReplaysInMemory()
  replays.sheets.splice(0, 1, aligned())
  const setup = setupOf({ a: { turbines: [{ turbine: 'Q01' }, { turbine: 'Q02' }] } })
  const args = ['sweep', '--site', 'a', '--from', '2026-03-01', '--to', '2026-03-15T12:00:00+02:00']
  const ran = await runCli(args, { setup, replays })
  expect(ran.status).toBe(0)
  expect(ran.out).toContain('- Q02: not in this replay')
  expect(replays.stores[0]).toMatchObject({
    fromMs: Date.UTC(2026, 2, 1),
    toMs: Date.UTC(2026, 2, 15, 10),
  })
})

test('a site that fails is named and does not stop the others; the sweep ends with 1', async () => {
  const ran = await runCli(['sweep', '--site', 'none', 'a', '--month', '2026-03'], {
    setup: setupOf({ a: {} }),
  })
  expect(ran.status).toBe(1)
  expect(ran.err).toBe('site none: error SITE_NOT_FOUND: site: expected one that was put, got "none"\n')
  expect(ran.out).toContain('Worklist of a, ')
  expect(ran.closed).toBe(1)
})

test.each([
  [[], '--site, --all: expected one of them, got neither'],
  [['--all', '--site', 'a', '--month', '2026-03'], '--site, --all: expected one of them, got both'],
  [['--all'], 'expected --month, or --from and --to'],
  [['--all', '--from', '2026-03-01'], 'expected --month, or --from and --to'],
  [['--all', '--month', '2026-13'], '--month: expected a month such as 2026-03, got "2026-13"'],
  [['--all', '--from', 'soon', '--to', '2026-03-01'], '--from: expected a date or a time'],
])('sweep %j is wrong use', async (args, message) => {
  const { status, err, closed } = await runCli(['sweep', ...args])
  expect(status).toBe(2)
  expect(err).toContain(message)
  expect(closed).toBe(0)
})
