import { createHash } from 'node:crypto'
import { mkdtemp, readFile, rm } from 'node:fs/promises'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { expect, test } from 'vitest'
import { openScans, quoteText } from '../../src/duck/index.ts'
import { accountAddsUp, failure, staged } from './staging.ts'

const T0 = Date.UTC(2026, 2, 1)
const TIMES = Array.from({ length: 20 }, (_, i) => T0 + i * 600_000)

/** Bytes of a Parquet file made by a query. */
async function parquet(query: string): Promise<Buffer> {
  const folder = await mkdtemp(join(tmpdir(), 'parquet-'))
  const scans = await openScans({ folder, memoryMb: 100, threads: 1 })
  try {
    const path = join(folder, 'x.parquet')
    await scans.withConnection((c) => c.run(`COPY (${query}) TO ${quoteText(path)} (FORMAT parquet)`))
    return await readFile(path)
  } finally {
    await scans.close()
    await rm(folder, { recursive: true })
  }
}

test('one JSON object per line is read, objects within objects too', async () => {
  const lines = TIMES.map((ms, i) =>
    JSON.stringify({
      time: new Date(ms).toISOString(),
      turbine: 'Q01',
      wind: { speed: i + 0.1 },
      power: i * 10,
      yawing: i > 5,
      note: 'a,"b"',
    }),
  )
  lines.splice(3, 0, '{"time": "2026-03-01T', '')
  const log = await staged(
    { 'a.ndjson': lines.join('\n') },
    { columns: { wind_speed: 'wind.speed', yaw_active: 'yawing' } },
  )
  expect(log.receipt).toMatchObject({ received: 21, accepted: 20, rejected: 1, blankLines: 1 })
  expect(log.receipt.rejectedByReason).toMatchObject([{ reason: 'json', firstLine: 4 }])
  expect(log.rows.map((row) => row['wind_speed'])).toEqual(TIMES.map((_, i) => i + 0.1))
  expect(log.rows[6]).toEqual({ turbine: 'Q01', time: TIMES[6], wind_speed: 6.1, power: 60, yaw_active: 1 })
  expect(accountAddsUp(log)).toBe(true)
})

test('keys that come late are named, and an array is refused with what to send', async () => {
  const many = Array.from({ length: 6000 }, (_, i) =>
    JSON.stringify({ time: T0 + i * 1000, turbine: 'Q01', power: i }),
  )
  many.push(JSON.stringify({ time: T0 + 6_000_000, turbine: 'Q01', power: 1, vane: 3 }))
  const log = await staged({ 'a.json': many.join('\n') })
  expect(log.receipt.warnings.join()).toContain('1 values have keys')
  const array = await failure(staged({ 'a.json': '[{"time": 1}]' }))
  expect(array).toMatchObject({ code: 'LOG_NO_HEADER' })
  expect(array.message).toContain('one JSON object per line')
})

test('a Parquet file is read to the same rows, and its checksum is that of the bytes sent', async () => {
  const bytes = await parquet(
    `SELECT TIMESTAMP '2026-03-01' + INTERVAL 10 MINUTE * r AS "Timestamp", 'Q01' AS turbine, (r * 0.1)::FLOAT AS "Wind speed (m/s)",
       CASE WHEN r = 3 THEN NULL ELSE r / 7.0 END AS vane, r > 5 AS yaw_active FROM range(20) t(r)`,
  )
  const log = await staged({ 'a.parquet': bytes })
  expect(log.receipt).toMatchObject({ received: 20, accepted: 20, intervalS: 600 })
  expect(log.receipt.inputs[0]?.sha256).toBe(createHash('sha256').update(bytes).digest('hex'))
  expect(log.rows.map((row) => row['vane'])).toEqual(TIMES.map((_, i) => (i === 3 ? null : i / 7)))
  expect(log.rows[7]).toMatchObject({ time: TIMES[7], wind_speed: 0.7, yaw_active: 1 })
  expect((await failure(staged({ 'a.parquet': bytes.subarray(0, 300) }))).code).toBe('LOG_CORRUPT')
})
