import { writeFile } from 'node:fs/promises'
import { join } from 'node:path'
import { buffer } from 'node:stream/consumers'
import { fromArrow, fromCSV } from 'arquero'
import { expect, onTestFinished, test } from 'vitest'
import { quoteText } from '../../src/duck/index.ts'
import type { Replays, RowsFormat } from '../../src/replay/index.ts'
import type { ScoreSheet } from '../../src/sheet/index.ts'
import { farmScenario, logCsv, emptyAccount, simulateFarm } from '../../src/simulate/index.ts'
import {
  demoRequest,
  demoText,
  filesBelow,
  makeFolder,
  openService,
  removeFolder,
  writeLog,
  type Service,
} from './farm.ts'

async function service(): Promise<Service & { folder: string }> {
  const folder = await makeFolder()
  onTestFinished(() => removeFolder(folder))
  const opened = await openService(folder)
  onTestFinished(() => opened.close())
  return { ...opened, folder }
}

/** Two turbines of the demo month. */
function demoRows(): string {
  const [header, ...rows] = demoText().trimEnd().split('\n') as [string, ...string[]]
  return `${header}\n${rows.filter((row) => /,Q0[46],/.test(row)).join('\n')}\n`
}

async function bytes(replays: Replays, id: string, format: RowsFormat): Promise<Buffer> {
  return buffer((await replays.rows(id, format)).stream)
}

/** Rows of each turbine by reason, as the sheet has them. */
function reasonsOf(sheet: ScoreSheet): Record<string, number> {
  return Object.fromEntries(
    sheet.turbines
      .flatMap(({ turbine, rows }) => [
        [`${turbine} used`, rows.used] as const,
        ...rows.setAside.map(({ reason, rows: n }) => [`${turbine} ${reason}`, n] as const),
      ])
      .filter(([, n]) => n > 0),
  )
}

interface Row {
  time: string
  turbine: string
  set_aside: string
  wind_speed: string
  vane: string
  coverage: string
}

function rowsOf(csv: string): Row[] {
  return fromCSV(csv, { autoType: false }).objects({ limit: Infinity }) as Row[]
}

function countOf(rows: readonly { turbine: string; set_aside: string }[]): Record<string, number> {
  const counts: Record<string, number> = {}
  for (const { turbine, set_aside } of rows) {
    counts[`${turbine} ${set_aside}`] = (counts[`${turbine} ${set_aside}`] ?? 0) + 1
  }
  return counts
}

test('every row comes out with its reason, and the reasons add up to those of the sheet', async () => {
  const { replays, folder } = await service()
  const sheet = await replays.oneShot(
    demoRequest({}, { logs: [await writeLog(folder, 'log.csv', demoRows())] }),
  )
  const { stream, mediaType } = await replays.rows(sheet.replay, 'csv')
  expect(mediaType).toBe('text/csv; charset=utf-8')
  const csv = (await buffer(stream)).toString()
  expect(csv.slice(0, 100)).toMatch(
    /^time,turbine,set_aside,coverage,wind_speed,normalised_wind_speed,air_density,/,
  )
  const rows = rowsOf(csv)
  expect(rows.length).toBe(sheet.rows.accepted)
  expect(countOf(rows)).toEqual(reasonsOf(sheet))
  const keys = rows.map(({ turbine, time }) => `${turbine} ${time}`)
  expect([...keys].sort()).toEqual(keys)
  expect(rows[0]!.time).toMatch(/^2026-0[23]-\d\dT\d\d:\d\d:00\.000Z$/)
  expect(csv).not.toMatch(/NaN|null|undefined/)
})

test('Parquet and Arrow hold the same rows as the CSV, to the last digit', async () => {
  const { replays, store, folder } = await service()
  const sheet = await replays.oneShot(
    demoRequest({}, { logs: [await writeLog(folder, 'log.csv', demoRows())] }),
  )
  const csv = (await bytes(replays, sheet.replay, 'csv')).toString()
  const expected = rowsOf(csv) as unknown as Record<string, string | null>[]
  const names = Object.keys(expected[0]!)
  const asText = (value: string | number | boolean | Date | null | undefined, name: string): string => {
    if (value === null || value === undefined) return ''
    if (name === 'time') return new Date(value as number | Date).toISOString()
    return value.toString()
  }

  const arrow = fromArrow(await bytes(replays, sheet.replay, 'arrow'))
  expect(arrow.columnNames()).toEqual(names)
  const fromArrowRows = arrow.objects({ limit: Infinity }) as Record<string, string | number | Date | null>[]
  const parquet = join(store.tempFolder, 'got.parquet')
  await writeFile(parquet, await bytes(replays, sheet.replay, 'parquet'))
  const fromParquet = await store.scans.withConnection((connection) =>
    connection.records(
      `SELECT * REPLACE (epoch_ms(time)::BIGINT AS time) FROM read_parquet(${quoteText(parquet)})`,
    ),
  )
  expect(Object.keys(fromParquet[0]!)).toEqual(names)
  expect(fromArrowRows.length).toBe(expected.length)
  expect(fromParquet.length).toBe(expected.length)
  for (const name of names) {
    const column = expected.map((row) => row[name] ?? '')
    expect(
      fromArrowRows.map((row) => asText(row[name], name)),
      `arrow ${name}`,
    ).toEqual(column)
    expect(
      fromParquet.map((row) => asText(row[name], name)),
      `parquet ${name}`,
    ).toEqual(column)
  }
})

test('a vane of the other sign comes out by the convention of the site file that was posted', async () => {
  const { replays, folder } = await service()
  const log = await writeLog(folder, 'log.csv', demoRows())
  const turned = demoRequest({}, { logs: [log] })
  const plain = await replays.oneShot(turned)
  const reversed = await replays.oneShot({
    ...turned,
    site: {
      ...turned.site,
      turbines: (turned.site.turbines ?? []).map((one) => ({
        ...one,
        vane: { ...one.vane, sign: -1 as const },
      })),
    },
  })
  const vanes = async (id: string) =>
    rowsOf((await bytes(replays, id, 'csv')).toString()).map(({ vane }) => vane)
  const [ahead, astern] = [await vanes(plain.replay), await vanes(reversed.replay)]
  const known = ahead.flatMap((vane, i) => (vane ? [[Number(vane), Number(astern[i])] as const] : []))
  expect(known.length).toBeGreaterThan(8000)
  for (const [a, b] of known) expect(a === 0 || a === -180 ? b : -b).toBe(a)
})

test('rows of a 1 Hz log are the ten-minute ones that were scored, whose interval the sheet states', async () => {
  const { replays, folder, store } = await service()
  const farm = simulateFarm(farmScenario({ seed: 5, turbines: 1, days: 1, rateS: 1 }))
  // Every second row of the second hour, and nothing of the third, are lost.
  const lines = [...logCsv(farm, emptyAccount())].join('').trimEnd().split('\n')
  const kept = lines.filter((_, i) => !(i > 7200 && i <= 10_800) && !(i > 3600 && i <= 7200 && i % 2 === 0))
  const log = await writeLog(folder, 'seconds.csv', `${kept.join('\n')}\n`)
  const sheet = await replays.oneShot({
    logs: [log],
    site: {},
    reading: {},
    settings: demoRequest().settings,
  })
  expect(sheet.window.intervalS).toBe(600)
  expect(sheet.receipt.intervalS).toBe(1)
  expect(sheet.rows.accepted).toBe(86_400 - 3600 - 1800)
  expect(sheet.turbines[0]!.rows.accepted).toBe(138)
  expect(sheet.warnings.filter((text) => text.includes('reduced'))).toEqual([
    'time: 81000 rows of mostly 1 s were reduced to 138 intervals of 600 s, which are what the turbines’ rows count',
  ])
  const rows = rowsOf((await bytes(replays, sheet.replay, 'csv')).toString())
  expect(countOf(rows)).toEqual(reasonsOf(sheet))
  const half = rows.filter(({ coverage }) => coverage === '0.5')
  expect(half.map(({ time, set_aside }) => `${time.slice(11, 16)} ${set_aside}`)).toEqual(
    ['01:00', '01:10', '01:20', '01:30', '01:40', '01:50'].map((time) => `${time} incomplete-interval`),
  )
  // The rows as they came are kept.
  const path = await store.frames.path(sheet.replay)
  const counted = await store.scans.withConnection((connection) =>
    connection.records(`SELECT count(*) AS n FROM read_parquet(${quoteText(path!)})`),
  )
  expect(counted).toEqual([{ n: 81_000 }])
})

test('rows that were removed by age are gone with a word, and those of no replay are not found', async () => {
  const { replays, store, folder } = await service()
  const sheet = await replays.oneShot(
    demoRequest({}, { logs: [await writeLog(folder, 'log.csv', demoRows())] }),
  )
  await expect(replays.rows('r9999', 'csv')).rejects.toThrow(
    expect.objectContaining({ code: 'REPLAY_NOT_FOUND' }) as Error,
  )
  await store.frames.prune(0)
  await expect(replays.rows(sheet.replay, 'csv')).rejects.toThrow(
    expect.objectContaining({ code: 'FRAME_GONE' }) as Error,
  )
  expect((await replays.get(sheet.replay)).sheet).toBe(JSON.stringify(sheet))
})

test('working files of an export go away, also when nobody reads it to its end', async () => {
  const { replays, folder } = await service()
  const sheet = await replays.oneShot(
    demoRequest({}, { logs: [await writeLog(folder, 'log.csv', demoRows())] }),
  )
  await bytes(replays, sheet.replay, 'parquet')
  const { stream } = await replays.rows(sheet.replay, 'parquet')
  const closed = new Promise((resolve) => stream.once('close', resolve))
  stream.destroy()
  await closed
  await expect
    .poll(() => filesBelow(folder), { timeout: 30_000 })
    .toEqual(['log.csv', `${sheet.replay}.parquet`].sort())
})
