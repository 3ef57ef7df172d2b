import { mkdtemp, readdir, rm, writeFile } from 'node:fs/promises'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { expect, test } from 'vitest'
import { openScans } from '../../src/duck/index.ts'
import { DEFAULT_LIMITS, describeLog, type LogReading } from '../../src/log/index.ts'

async function described(bytes: string | Uint8Array, reading: LogReading = {}) {
  const folder = await mkdtemp(join(tmpdir(), 'describe-'))
  const scans = await openScans({ folder, memoryMb: 100, threads: 1 })
  try {
    const path = join(folder, 'sent')
    await writeFile(path, bytes)
    const answer = await describeLog({ name: 'Q01.csv', path }, reading, {
      scans,
      folder,
      limits: DEFAULT_LIMITS,
    })
    expect((await readdir(folder)).sort()).toEqual(['duck-temp', 'sent'])
    return answer
  } finally {
    await scans.close()
    await rm(folder, { recursive: true })
  }
}

const lines = (n: number) =>
  Array.from(
    { length: n },
    (_, i) => `${new Date(Date.UTC(2026, 2, 1) + i * 600_000).toISOString()};Q01;7,${i % 10};${i % 5}`,
  )

test('a description tells dialect, times, columns, first rows and what is missing, and leaves nothing behind', async () => {
  const answer = await described(`time;turbine;Wind speed (m/s);status\n${lines(20_000).join('\n')}\n`)
  expect(answer).toMatchObject({
    form: 'delimited',
    delimiter: ';',
    decimalComma: true,
    encoding: 'utf-8',
    headerLine: 1,
    timezone: 'UTC',
    stamp: 'begin',
    intervalS: 600,
    missing: ['vane', 'power', 'nacelle_position', 'air_temperature'],
    problem: null,
  })
  expect(answer.timeFormat).toContain('year-month-day')
  expect(answer.firstRows).toHaveLength(5)
  expect(answer.firstRows[1]).toEqual({
    turbine: 'Q01',
    time: '2026-03-01T00:10:00.000Z',
    wind_speed: 7.1,
    status: '1',
  })
  expect(answer.columns.map(({ takenFor }) => takenFor)).toEqual(['time', 'turbine', 'wind_speed', 'status'])
})

test('what would stop the reading is part of the answer', async () => {
  const unknown = await described('when,what\n1,2\n')
  expect(unknown.problem).toMatchObject({ code: 'LOG_COLUMNS_MISSING' })
  const bad = await described('time,turbine,power\n2026-03-01T00:00:00Z,Q01,high\n')
  expect(bad.problem).toMatchObject({ code: 'LOG_COLUMN_UNREADABLE' })
  expect(bad.columns.map(({ takenFor }) => takenFor)).toEqual(['time', 'turbine', 'power'])
})

test('a long UTF-16 log is cut at a line', async () => {
  const text = Buffer.from(
    '\ufefftime;turbine;Wind speed (m/s);status\r\n' + lines(9000).join('\r\n'),
    'utf16le',
  )
  const answer = await described(text)
  expect(answer).toMatchObject({ encoding: 'utf-16le', problem: null, rejectedByReason: [] })
})
