import { onTestFinished, expect, test } from 'vitest'
import { normals } from '../kernel/stats/normals.ts'
import type { Scorers } from '../../src/replay/index.ts'
import type { ScoreSheet } from '../../src/sheet/index.ts'
import { openCompiledScorers } from './compiled-scorers.ts'
import {
  DEMO_SITE,
  demoRequest,
  demoText,
  filesBelow,
  makeFolder,
  openService,
  removeFolder,
  writeLog,
  type Service,
} from './farm.ts'

const KNOWN = { assumedResponsePctPerDeg: 0 }

async function service(scorers?: Scorers): Promise<Service & { folder: string }> {
  const folder = await makeFolder()
  onTestFinished(() => removeFolder(folder))
  const opened = await openService(folder, 'r', scorers)
  onTestFinished(() => opened.close())
  return { ...opened, folder }
}

/** Two weeks of two turbines in the demo log: enough to score, quick to read. */
function twoTurbines(): { header: string; rows: string[] } {
  const [header, ...rows] = demoText().trimEnd().split('\n') as [string, ...string[]]
  return { header, rows: rows.filter((row) => /^2026-03-(0\d|1[0-4])[^,]*,Q0[46],/.test(row)) }
}

const textOf = ({ header, rows }: { header: string; rows: string[] }): string =>
  `${header}\n${rows.join('\n')}\n`

/** A sheet without what names this replay and this file. */
function withoutNames(sheet: ScoreSheet): unknown {
  return JSON.parse(
    JSON.stringify({
      ...sheet,
      replay: '',
      receipt: { ...sheet.receipt, inputs: [] },
      provenance: { ...sheet.provenance, inputs: [] },
    }),
  )
}

test('a replay outlives the service: closed and opened again, it still answers', async () => {
  const folder = await makeFolder()
  onTestFinished(() => removeFolder(folder))
  const first = await openService(folder, 'a')
  const log = await writeLog(folder, 'log.csv', textOf(twoTurbines()))
  const sheet = await first.replays.oneShot(demoRequest(KNOWN, { logs: [log] }))
  await first.close()

  const second = await openService(folder, 'b')
  onTestFinished(() => second.close())
  expect((await second.replays.get(sheet.replay)).sheet).toBe(JSON.stringify(sheet))
  const { replays, next } = await second.replays.list({ limit: 10 })
  expect(replays.map(({ id }) => id)).toEqual([sheet.replay])
  expect(next).toBeNull()
  await second.replays.remove(sheet.replay)
  const gone: unknown = expect.objectContaining({ code: 'REPLAY_NOT_FOUND' })
  await expect(second.replays.get(sheet.replay)).rejects.toThrow(gone)
  await expect(second.replays.remove(sheet.replay)).rejects.toThrow(gone)
  expect(filesBelow(folder)).toEqual(['log.csv']) // its frame went with it
})

test('the same log twice gives the same sheet under another id', async () => {
  const { replays, folder } = await service()
  const log = await writeLog(folder, 'log.csv', textOf(twoTurbines()))
  const [one, two] = [
    await replays.oneShot(demoRequest(KNOWN, { logs: [log] })),
    await replays.oneShot(demoRequest(KNOWN, { logs: [log] })),
  ]
  expect(two.replay).not.toBe(one.replay)
  expect(JSON.stringify({ ...two, replay: one.replay })).toBe(JSON.stringify(one))
})

test('the order of rows does not matter, nor whether turbines come in one log or in two', async () => {
  const { replays, folder } = await service()
  const { header, rows } = twoTurbines()
  const inOrder = await replays.oneShot(
    demoRequest(KNOWN, { logs: [await writeLog(folder, 'log.csv', textOf({ header, rows }))] }),
  )
  const draw = normals(5)
  const shuffled = rows
    .map((row) => [draw(), row] as const)
    .sort(([a], [b]) => a - b)
    .map(([, row]) => row)
  const mixed = await replays.oneShot(
    demoRequest(KNOWN, { logs: [await writeLog(folder, 'log.csv', textOf({ header, rows: shuffled }))] }),
  )
  expect(withoutNames(mixed)).toEqual(withoutNames(inOrder))
  expect(mixed.provenance.inputs[0]!.sha256).not.toBe(inOrder.provenance.inputs[0]!.sha256)

  const own = (turbine: string) => rows.filter((row) => row.includes(`,${turbine},`))
  const split = await replays.oneShot(
    demoRequest(KNOWN, {
      logs: [
        await writeLog(folder, 'second.csv', textOf({ header, rows: own('Q06') })),
        await writeLog(folder, 'first.csv', textOf({ header, rows: own('Q04') })),
      ],
    }),
  )
  expect(JSON.stringify(split.turbines)).toBe(JSON.stringify(inOrder.turbines))
})

test('worker threads give the same sheet to the last digit', async () => {
  const here = await service()
  const spread = await service(await openCompiledScorers(2))
  const log = await writeLog(here.folder, 'log.csv', textOf(twoTurbines()))
  const one = await here.replays.oneShot(demoRequest(KNOWN, { logs: [log] }))
  const two = await spread.replays.oneShot(demoRequest(KNOWN, { logs: [log] }))
  expect(two).toEqual(one)
  expect(JSON.stringify(two) === JSON.stringify(one)).toBe(true) // in short: a sheet is long
})

test('another seed draws other days: the interval moves a little, the estimate not at all', async () => {
  const { replays, folder } = await service()
  const log = await writeLog(folder, 'log.csv', textOf(twoTurbines()))
  const one = await replays.oneShot(demoRequest(KNOWN, { logs: [log] }))
  const two = await replays.oneShot(demoRequest({ ...KNOWN, seed: 2 }, { logs: [log] }))
  one.turbines.forEach(({ staticOffset }, i) => {
    const other = two.turbines[i]!.staticOffset
    expect(other.estimateDeg).toBe(staticOffset.estimateDeg)
    const ratio = other.intervalParts.statistical! / staticOffset.intervalParts.statistical!
    expect(ratio).not.toBe(1)
    // An SD from 400 resamples is right to 3.5 %; two of them differ by 5 %; four such.
    expect(Math.abs(ratio - 1)).toBeLessThan(0.2)
  })
})

test('progress runs from reading over scoring to writing, and counts every turbine', async () => {
  const { replays, folder } = await service()
  const log = await writeLog(folder, 'log.csv', textOf(twoTurbines()))
  const seen: string[] = []
  await replays.oneShot(demoRequest(KNOWN, { logs: [log] }), ({ stage, share }) =>
    seen.push(`${stage} ${share}`),
  )
  expect(seen.filter((line) => line.startsWith('scoring'))).toEqual(['scoring 0', 'scoring 0.5', 'scoring 1'])
  expect(seen[0]).toBe('reading 0')
  expect(seen.at(-1)).toBe('writing 0')
})

test('after a replay its frame is kept and no working file is left', async () => {
  const { replays, store, folder } = await service()
  const { header, rows } = twoTurbines()
  // A row that is rejected, so that there is a file of rejected rows to clear away too.
  const log = await writeLog(
    folder,
    'log.csv',
    textOf({ header, rows: [...rows, 'not a time,Q04,7,,,,,,,,,,,,,'] }),
  )
  const sheet = await replays.oneShot(demoRequest(KNOWN, { logs: [log] }))
  expect(sheet.rows.rejected).toBe(1)
  expect(filesBelow(store.tempFolder)).toEqual([])
  expect(filesBelow(folder).length).toBe(2) // the log, and the frame
})

test('a log without a vane is refused by name, and leaves nothing behind', async () => {
  const { replays, store, folder } = await service()
  const { header, rows } = twoTurbines()
  const columns = header.split(',')
  const kept = (line: string): string =>
    line
      .split(',')
      .filter((_, i) => !['vane', 'vane_sd', 'power'].includes(columns[i]!))
      .join(',')
  const log = await writeLog(
    folder,
    'log.csv',
    textOf({ header: `${kept(header)},mystery`, rows: rows.map((row) => `${kept(row)},1`) }),
  )
  const refused = replays.oneShot(demoRequest(KNOWN, { logs: [log] }))
  const error = await refused.then(
    () => undefined,
    (reason: unknown) => reason as { code: string; message: string; detail: Record<string, unknown> },
  )
  expect(error?.code).toBe('LOG_COLUMNS_MISSING')
  expect(error?.detail['missing']).toEqual(['vane', 'power'])
  expect(error?.detail['recognised']).toContain('wind_speed')
  expect(error?.detail['notUsed']).toContain('mystery')
  expect(error?.message).toContain('mystery')
  expect(filesBelow(store.tempFolder)).toEqual([])
  expect(filesBelow(folder)).toEqual(['log.csv'])
  expect((await replays.list({ limit: 10 })).replays).toEqual([])
})

test('a log that cannot be read, and an unknown zone, leave nothing behind', async () => {
  const { replays, store, folder } = await service()
  const empty = await writeLog(folder, 'empty.csv', '')
  await expect(replays.oneShot(demoRequest(KNOWN, { logs: [empty] }))).rejects.toThrow(
    expect.objectContaining({ code: 'LOG_EMPTY' }) as Error,
  )
  const log = await writeLog(folder, 'log.csv', textOf(twoTurbines()))
  await expect(
    replays.oneShot(demoRequest(KNOWN, { logs: [log], site: { ...DEMO_SITE, timezone: 'Europe/Atlantis' } })),
  ).rejects.toThrow(expect.objectContaining({ code: 'BAD_OPTION' }) as Error)
  expect(filesBelow(store.tempFolder)).toEqual([])
  expect(filesBelow(folder)).toEqual(['empty.csv', 'log.csv'])
  expect((await replays.list({ limit: 10 })).replays).toEqual([])
})

test('a turbine of the site file that the log does not hold is warned of', async () => {
  const { replays, folder } = await service()
  const log = await writeLog(folder, 'log.csv', textOf(twoTurbines()))
  const { warnings, turbines } = await replays.oneShot(demoRequest(KNOWN, { logs: [log] }))
  expect(turbines.map(({ turbine }) => turbine)).toEqual(['Q04', 'Q06'])
  for (const absent of ['Q01', 'Q02', 'Q03', 'Q05', 'Q07', 'Q08']) {
    expect(
      warnings.some((warning) => warning.startsWith(`${absent}:`)),
      absent,
    ).toBe(true)
  }
})

test('without sign and kind of vane a number is shown and none is given to enter', async () => {
  const { replays, folder } = await service()
  const log = await writeLog(folder, 'log.csv', textOf(twoTurbines()))
  const site = {
    ...DEMO_SITE,
    turbines: DEMO_SITE.turbines!.map(({ turbine, model }) => ({
      turbine,
      ...(model === undefined ? {} : { model }),
    })),
  }
  const { worklist, turbines } = await replays.oneShot(demoRequest(KNOWN, { logs: [log], site }))
  expect(worklist.length).toBe(2)
  for (const entry of worklist) {
    expect(entry.addToVaneDeg).toBeNull()
    expect(entry.standingMisalignmentDeg).not.toBeNull()
  }
  for (const { staticOffset, advice } of turbines) {
    expect(staticOffset).toMatchObject({ signChecked: false, vaneLogged: 'unknown' })
    expect(advice.join(' ')).toMatch(/no number to enter yet/i)
  }
})

test('a vane that stands still blocks its turbine and no other', async () => {
  const { replays, folder } = await service()
  const { header, rows } = twoTurbines()
  const vane = header.split(',').indexOf('vane')
  const stuck = rows.map((row) => {
    if (!row.includes(',Q04,')) return row
    const fields = row.split(',')
    fields[vane] = '1.25'
    return fields.join(',')
  })
  const log = await writeLog(folder, 'log.csv', textOf({ header, rows: stuck }))
  const { turbines, worklist } = await replays.oneShot(demoRequest(KNOWN, { logs: [log] }))
  expect(turbines[0]).toMatchObject({
    turbine: 'Q04',
    verdict: 'blocked',
    reasonCode: 'vane-still',
    score: null,
  })
  expect(turbines[0]!.sensors).toHaveLength(1)
  expect(turbines[0]!.staticOffset.estimateDeg).toBeNull()
  expect(turbines[1]).toMatchObject({ turbine: 'Q06', verdict: 'offset' })
  // The vane is a reason to go there, behind the turbine that stands off, and no number is given to enter.
  expect(worklist.map(({ turbine, addToVaneDeg }) => [turbine, addToVaneDeg === null])).toEqual([
    ['Q06', false],
    ['Q04', true],
  ])
})
