import { createHash } from 'node:crypto'
import { readFile, readdir, rm, statfs, writeFile } from 'node:fs/promises'
import { join } from 'node:path'
import { gzipSync } from 'node:zlib'
import { expect, test } from 'vitest'
import { createIntake } from '../../src/intake/index.ts'
import { createRandom } from '../../src/kernel/stats/index.ts'
import { DEFAULT_LIMITS } from '../../src/log/index.ts'
import type { SiteFile } from '../../src/sheet/index.ts'
import { counter, makeFolder, makeSmallDisk, openTestStore } from '../store/folder.ts'
import { readRows } from '../store/logs.ts'

const MARCH = Date.UTC(2026, 2, 1)

test('a posted log is accounted for and its rows are kept', async () => {
  const { intake, store, file } = await farm()
  const log = await file('march.csv', [
    'time,turbine,wind_speed,vane,power',
    '2026-03-01T00:00:00Z,Q01,8,1.5,900',
    '2026-03-01T00:10:00Z,Q01,8.5,-1.5,1000',
    'never,Q01,8.5,-1.5,1000',
    '2026-03-01T00:00:00Z,Q02,7,0,700',
  ])
  const { batch, isNew } = await intake.post('quern-hill', [log], {})
  expect(isNew).toBe(true)
  expect(batch.receipt).toMatchObject({ received: 4, accepted: 3, duplicate: 0, rejected: 1 })
  expect(batch.receipt.warnings).toContainEqual(expect.stringContaining('"Q02"'))
  expect(await intake.get('quern-hill', batch.batch)).toEqual(batch)
  expect(await readRows(store, 'quern-hill')).toEqual([
    ['Q01', MARCH, 900],
    ['Q01', MARCH + 600_000, 1000],
    ['Q02', MARCH, 700],
  ])
  const rejected = await readFile((await intake.rejectedPath('quern-hill', batch.batch))!, 'utf8')
  expect(rejected).toContain('never')
  expect(await readdir(store.tempFolder)).toEqual([expect.stringContaining('.parquet')])
})

test('the same bytes are answered with the first receipt under any name, and read again when the reading differs', async () => {
  const { intake, store, file } = await farm({ turbines: [{ turbine: 'Q01' }, { turbine: 'Q02' }] })
  const lines = [
    'time,turbine,wind_speed,vane,power',
    '2026-03-01T01:00:00,Q01,8,1.5,900',
    '2026-03-01T01:10:00,Q01,8,1.5,900',
  ]
  const first = await intake.post('quern-hill', [await file('a.csv', lines)], {})
  const again = await intake.post('quern-hill', [await file('b.csv', lines)], {})
  expect(again).toEqual({ batch: first.batch, isNew: false })
  const zoned = await intake.post('quern-hill', [await file('a.csv', lines)], { timezone: 'Europe/Berlin' })
  expect(zoned.isNew).toBe(true)
  // The site's own zone is part of how a log is read.
  await store.sites.change('quern-hill', (site) => ({ ...site, timezone: 'Europe/Helsinki' }))
  const moved = await intake.post('quern-hill', [await file('a.csv', lines)], {})
  expect(moved.isNew).toBe(true)
  // Winter: Berlin is one hour, Helsinki two hours ahead of UTC.
  expect((await readRows(store, 'quern-hill')).map(([, time]) => (time - MARCH) / 600_000)).toEqual([
    -6, -5, 0, 1, 6, 7,
  ])
})

test('equal bytes of two turbines that only the file names tell apart are two logs', async () => {
  const { intake, store, file } = await farm()
  const lines = [
    'time,wind_speed,vane,power',
    '2026-03-01T00:00:00Z,8,1.5,900',
    '2026-03-01T00:10:00Z,8,1.5,900',
  ]
  await intake.post('quern-hill', [await file('Q01.csv', lines)], {})
  const second = await intake.post('quern-hill', [await file('Q02.csv', lines)], {})
  expect(second.isNew).toBe(true)
  const third = await intake.post('quern-hill', [await file('Q02.csv', lines)], {})
  expect(third).toEqual({ batch: second.batch, isNew: false })
  expect((await store.logs.extents('quern-hill')).length).toBe(2)
})

test('posts at the same time do not get into each other', async () => {
  const { intake, store, file } = await farm()
  const posts = await Promise.all(
    Array.from({ length: 6 }, async (_, i) => {
      const stamp = (k: number) => new Date(MARCH + k * 600_000).toISOString()
      const log = await file(`part-${i}.csv`, [
        'time,turbine,power',
        `${stamp(2 * i)},Q01,${i}`,
        `${stamp(2 * i + 1)},Q01,${i}`,
        `never,Q01,${i}`,
      ])
      return intake.post('quern-hill', [log], {})
    }),
  )
  expect(await readRows(store, 'quern-hill')).toEqual(
    Array.from({ length: 12 }, (_, k) => ['Q01', MARCH + k * 600_000, Math.floor(k / 2)]),
  )
  for (const [i, { batch }] of posts.entries()) {
    const rejected = await readFile((await intake.rejectedPath('quern-hill', batch.batch))!, 'utf8')
    expect(rejected).toContain(`never,Q01,${i}`)
  }
})

test('a log that cannot be used leaves nothing behind', async () => {
  const { intake, store, file } = await farm()
  await expect(intake.post('quern-hill', [await file('x.csv', ['time,turbine', ''])], {})).rejects.toThrow(
    expect.objectContaining({ code: expect.stringMatching(/^LOG_/) as string }) as Error,
  )
  await expect(
    intake.post('quern-hill', [{ name: 'gone.csv', path: join(store.tempFolder, 'gone.csv') }], {}),
  ).rejects.toThrow(expect.objectContaining({ code: 'LOG_NOT_FOUND' }) as Error)
  await expect(intake.post('elsewhere', [], {})).rejects.toThrow(
    expect.objectContaining({ code: 'SITE_NOT_FOUND' }) as Error,
  )
  expect((await intake.list('quern-hill', { limit: 10 })).batches).toEqual([])
  expect(await readdir(store.tempFolder)).toEqual([])
})

test('compressed logs are read as they are', async () => {
  const { intake, store, folder } = await farm()
  const path = join(folder, 'march.csv.gz')
  await writeFile(
    path,
    gzipSync('time,turbine,power\n2026-03-01T00:00:00Z,Q01,5\n2026-03-01T00:10:00Z,Q01,6\n'),
  )
  await intake.post('quern-hill', [{ name: 'march.csv.gz', path }], {})
  expect((await readRows(store, 'quern-hill')).map(([, , power]) => power)).toEqual([5, 6])
})

test('the receipt names the bytes by their checksum, and one that the caller has made is taken', async () => {
  const { intake, file } = await farm()
  const log = await file('march.csv', ['time,turbine,power', '2026-03-01T00:00:00Z,Q01,5'])
  const sha256 = createHash('sha256')
    .update(await readFile(log.path))
    .digest('hex')
  const { batch } = await intake.post('quern-hill', [log], {})
  expect(batch.receipt.inputs).toEqual([{ name: 'march.csv', sha256, rows: 1 }])
  expect(await intake.post('quern-hill', [{ ...log, sha256 }], {})).toEqual({ batch, isNew: false })
  // The caller's word is taken: bytes under another checksum are another log.
  const other = await intake.post('quern-hill', [{ ...log, sha256: 'f'.repeat(64) }], {})
  expect(other.isNew).toBe(true)
  expect(other.batch.receipt.inputs).toEqual([{ name: 'march.csv', sha256: 'f'.repeat(64), rows: 1 }])
})

test('a disk that is full while a log is being read is named as such, and nothing of the log stays', async (context) => {
  const disk = await makeSmallDisk(16)
  if (!disk) {
    context.skip('this user may not mount a small disk')
    return
  }
  const { intake, store, file } = await farm(undefined, disk)
  const random = createRandom(1)
  const lines = Array.from({ length: 20_000 }, (_, i) => {
    const time = new Date(MARCH + i * 60_000).toISOString()
    return `${time},Q01,${random.uint32() / 2 ** 22}`
  })
  const ballast = join(disk, 'ballast')
  const log = await file('march.csv', ['time,turbine,power', ...lines])
  const { bavail, bsize } = await statfs(disk)
  await writeFile(ballast, Buffer.alloc(bavail * bsize - 8192))
  await expect(intake.post('quern-hill', [log], {})).rejects.toThrow(
    expect.objectContaining({ code: 'STORAGE_FULL' }) as Error,
  )
  await rm(ballast)
  expect(await readdir(store.tempFolder)).toEqual([])
  expect((await intake.list('quern-hill', { limit: 10 })).batches).toEqual([])
  expect((await intake.post('quern-hill', [log], {})).batch.receipt.accepted).toBe(20_000)
})

test('coverage lists every day with the rows that were expected, also days without any', async () => {
  const { intake, file } = await farm({ intervalS: 3600, turbines: [{ turbine: 'Q09' }] })
  const log = await file('march.csv', [
    'time,turbine,power',
    '2026-03-01T22:00:00Z,Q01,1',
    '2026-03-01T23:00:00Z,Q01,1',
    '2026-03-03T05:00:00Z,Q01,1',
  ])
  await intake.post('quern-hill', [log], {})
  const day = (name: string, rows: number, expected: number, first: string | null, last: string | null) => ({
    day: name,
    rows,
    expected,
    first,
    last,
  })
  const of22 = '2026-03-01T22:00:00.000Z'
  const of23 = '2026-03-01T23:00:00.000Z'
  const of5 = '2026-03-03T05:00:00.000Z'
  expect(await intake.coverage('quern-hill', 'Q01')).toEqual({
    site: 'quern-hill',
    turbine: 'Q01',
    intervalS: 3600,
    days: [
      day('2026-03-01', 2, 24, of22, of23),
      day('2026-03-02', 0, 24, null, null),
      day('2026-03-03', 1, 24, of5, of5),
    ],
  })
  const window = { fromMs: MARCH + 23 * 3_600_000, toMs: MARCH + 30 * 3_600_000 }
  expect((await intake.coverage('quern-hill', 'Q01', window)).days).toEqual([
    day('2026-03-01', 1, 1, of23, of23),
    day('2026-03-02', 0, 6, null, null),
  ])
  expect((await intake.coverage('quern-hill', 'Q09')).days).toEqual([])
  expect((await intake.coverage('quern-hill', 'Q01', { fromMs: MARCH + 1e10 })).days).toEqual([])
})

test('the interval of coverage comes from the log where the site file gives none', async () => {
  const { intake, file } = await farm()
  const log = await file('march.csv', [
    'time,turbine,power',
    '2026-03-01T00:00:00Z,Q01,1',
    '2026-03-01T00:10:00Z,Q01,1',
  ])
  await intake.post('quern-hill', [log], {})
  expect(await intake.coverage('quern-hill', 'Q01')).toMatchObject({
    intervalS: 600,
    days: [{ rows: 2, expected: 144 }],
  })
})

test('coverage of what is not there, or of a window that makes no sense, is refused', async () => {
  const { intake } = await farm()
  await expect(intake.coverage('x', 'Q01')).rejects.toThrow(
    expect.objectContaining({ code: 'SITE_NOT_FOUND' }) as Error,
  )
  await expect(intake.coverage('quern-hill', 'Q77')).rejects.toThrow(
    expect.objectContaining({ code: 'TURBINE_NOT_FOUND' }) as Error,
  )
  for (const window of [
    { fromMs: MARCH, toMs: MARCH },
    { fromMs: 0, toMs: MARCH },
    { fromMs: NaN, toMs: MARCH },
  ]) {
    await expect(intake.coverage('quern-hill', 'Q01', window), JSON.stringify(window)).rejects.toThrow(
      expect.objectContaining({ code: 'BAD_REQUEST' }) as Error,
    )
  }
})

async function farm(site: SiteFile = { turbines: [{ turbine: 'Q01' }] }, disk?: string) {
  const folder = disk ?? (await makeFolder())
  const store = await openTestStore(join(folder, 'data'), {
    report: (error) => {
      throw error instanceof Error ? error : new Error(String(error))
    },
  })
  await store.sites.put('quern-hill', site.turbines ? site : { ...site, turbines: [{ turbine: 'Q01' }] })
  const intake = createIntake({ store, limits: DEFAULT_LIMITS, newId: counter('post') })
  const file = async (name: string, lines: readonly string[]) => {
    const path = join(folder, name)
    await writeFile(path, lines.join('\n') + '\n')
    return { name, path }
  }
  return { intake, store, folder, file }
}
