import { existsSync } from 'node:fs'
import { readFile, readdir, rm, statfs, writeFile } from 'node:fs/promises'
import { join } from 'node:path'
import fc from 'fast-check'
import { expect, test } from 'vitest'
import { writeParquet } from '../../src/duck/index.ts'
import { createRandom } from '../../src/kernel/stats/index.ts'
import { openStore, type Store } from '../../src/store/index.ts'
import { counter, makeFolder, makeSmallDisk, openTestStore } from './folder.ts'
import { addRows, readRows, receiptOf, stageRows, type LogRow } from './logs.ts'

const MARCH = Date.UTC(2026, 2, 1)
const APRIL = Date.UTC(2026, 3, 1)
const STEP = 600_000

test('a log comes back after a restart, one segment file for each month', async () => {
  const folder = await makeFolder()
  const store = await siteStore(folder)
  const rows: LogRow[] = [
    ['Q01', APRIL - STEP, 1],
    ['Q01', APRIL, 2.5],
    ['Q02', APRIL - 1, null],
    ['Q02', APRIL, 4],
  ]
  const { isNew } = await addRows(store, 'quern-hill', rows)
  expect(isNew).toBe(true)
  await store.close()
  expect((await readdir(join(folder, 'segments'))).length).toBe(2)
  const again = await openTestStore(folder)
  expect(await readRows(again, 'quern-hill')).toEqual(rows)
  expect(await again.logs.verify()).toEqual([])
})

test('a window holds its start and not its end, and only the turbines asked for', async () => {
  const store = await siteStore()
  const rows: LogRow[] = []
  for (const turbine of ['Q01', 'Q02', "Q'3"])
    for (let i = 0; i < 5; i++) rows.push([turbine, MARCH + i * STEP, i])
  await addRows(store, 'quern-hill', rows)
  const window = { fromMs: MARCH + STEP, toMs: MARCH + 3 * STEP, turbines: ["Q'3", 'Q02'] }
  expect(await readRows(store, 'quern-hill', window)).toEqual([
    ["Q'3", MARCH + STEP, 1],
    ["Q'3", MARCH + 2 * STEP, 2],
    ['Q02', MARCH + STEP, 1],
    ['Q02', MARCH + 2 * STEP, 2],
  ])
  expect(await readRows(store, 'quern-hill', { turbines: [] })).toEqual([])
  expect(await readRows(store, 'quern-hill', { fromMs: APRIL })).toEqual([])
})

test('the same content posted again is answered with the first receipt and changes nothing', async () => {
  const folder = await makeFolder()
  const store = await siteStore(folder)
  const first = await addRows(store, 'quern-hill', [['Q01', MARCH, 1]], { contentKey: 'same' })
  await addRows(store, 'quern-hill', [['Q01', MARCH, 2]])
  const again = await addRows(store, 'quern-hill', [['Q01', MARCH, 1]], { contentKey: 'same' })
  expect(again).toEqual({ batch: first.batch, isNew: false })
  expect(await readRows(store, 'quern-hill')).toEqual([['Q01', MARCH, 2]])
  // Two at the same time, where neither can see the other before it is done.
  const both = await Promise.all(
    [1, 2].map(() => addRows(store, 'quern-hill', [['Q01', MARCH + STEP, 3]], { contentKey: 'both' })),
  )
  expect(both.map(({ isNew }) => isNew).sort()).toEqual([false, true])
  expect(both[0]!.batch).toEqual(both[1]!.batch)
  await store.close()
  expect((await readdir(join(folder, 'segments'))).length).toBe(3)
})

test('content that was deleted can be posted again', async () => {
  const store = await siteStore()
  const { batch } = await addRows(store, 'quern-hill', [['Q01', MARCH, 1]], { contentKey: 'same' })
  await store.logs.remove('quern-hill', batch.batch)
  const again = await addRows(store, 'quern-hill', [['Q01', MARCH, 1]], { contentKey: 'same' })
  expect(again.isNew).toBe(true)
  expect(await readRows(store, 'quern-hill')).toEqual([['Q01', MARCH, 1]])
})

test('a correction replaces rows, and deleting it brings them back, also after compaction', async () => {
  for (const withCompaction of [false, true]) {
    const store = await siteStore(undefined, { mergeCount: 2, largeRows: 1_000 })
    const original: LogRow[] = [0, 1, 2].map((i) => ['Q01', MARCH + i * STEP, i] as const)
    await addRows(store, 'quern-hill', original)
    const { batch } = await addRows(store, 'quern-hill', [
      ['Q01', MARCH + STEP, 11],
      ['Q01', MARCH + 7 * STEP, 17],
    ])
    if (withCompaction) await store.logs.compact()
    expect(await readRows(store, 'quern-hill')).toEqual([
      ['Q01', MARCH, 0],
      ['Q01', MARCH + STEP, 11],
      ['Q01', MARCH + 2 * STEP, 2],
      ['Q01', MARCH + 7 * STEP, 17],
    ])
    await store.logs.remove('quern-hill', batch.batch)
    expect(await readRows(store, 'quern-hill')).toEqual(original)
    await store.logs.compact()
    expect(await readRows(store, 'quern-hill')).toEqual(original)
  }
})

test('many small logs become few files with the same answer, and the old files go', async () => {
  const folder = await makeFolder()
  const store = await siteStore(folder, { mergeCount: 4, largeRows: 1_000 })
  const rows: LogRow[] = []
  for (let i = 0; i < 40; i++) {
    const row: LogRow = ['Q01', MARCH + i * STEP, i]
    rows.push(row)
    // Another column in every second log: files that are merged need not have the same ones.
    await addRows(store, 'quern-hill', [row], i % 2 ? { extra: ", 'run' AS status" } : {})
  }
  await store.logs.compact()
  expect(await readRows(store, 'quern-hill')).toEqual(rows)
  expect((await store.logs.readWindow('quern-hill')).channels.sort()).toEqual(['power', 'status'])
  expect(await store.logs.verify()).toEqual([])
  await store.close()
  // At most three are left at each of the sizes from 1, 4 and 16 rows.
  expect((await readdir(join(folder, 'segments'))).length).toBeLessThanOrEqual(9)
})

test('a segment that is damaged is named, and is not merged away', async () => {
  const folder = await makeFolder()
  const reports: unknown[] = []
  const store = await siteStore(folder, { mergeCount: 2, largeRows: 1_000 }, (error) => reports.push(error))
  await addRows(store, 'quern-hill', [['Q01', MARCH, 1]])
  await store.logs.compact()
  const [name] = await readdir(join(folder, 'segments'))
  await writeFile(join(folder, 'segments', name!), 'x', { flag: 'r+' })
  expect(await store.logs.verify()).toEqual([name!.replace('.parquet', '')])
  await addRows(store, 'quern-hill', [['Q01', MARCH + STEP, 2]])
  await store.logs.compact()
  expect(reports.map(String).join()).toMatch(/checksum/)
  expect(existsSync(join(folder, 'segments', name!))).toBe(true)
})

test('a turbine that the site file lacks is added to it, and the receipt warns', async () => {
  const store = await siteStore()
  const { batch } = await addRows(store, 'quern-hill', [
    ['Q01', MARCH, 1],
    ['Q07', MARCH, 1],
  ])
  expect((await store.sites.get('quern-hill'))?.turbines).toEqual([
    { turbine: 'Q01', ratedPowerKw: 2300 },
    { turbine: 'Q07' },
  ])
  expect(batch.receipt.warnings).toEqual([expect.stringContaining('"Q07"')])
  expect((await store.logs.get('quern-hill', batch.batch)).receipt).toEqual(batch.receipt)
})

test('a turbine whose name cannot be set up keeps its rows, and the site file stays one that can be put', async () => {
  const store = await siteStore()
  const { batch } = await addRows(store, 'quern-hill', [['WTG/01', MARCH, 1]])
  expect(batch.receipt.warnings).toEqual([expect.stringMatching(/"WTG\/01".*without "\/"/)])
  expect((await store.sites.get('quern-hill'))?.turbines).toEqual([{ turbine: 'Q01', ratedPowerKw: 2300 }])
  expect(await readRows(store, 'quern-hill')).toEqual([['WTG/01', MARCH, 1]])
})

test('a log of more turbines than a site can have is refused whole', async () => {
  const store = await siteStore()
  const rows = Array.from({ length: 5_000 }, (_, i) => [`T${i}`, MARCH, 1] as const)
  await expect(addRows(store, 'quern-hill', rows)).rejects.toThrow(
    expect.objectContaining({ code: 'LOG_COLUMN_MAP' }) as Error,
  )
  expect(await readRows(store, 'quern-hill')).toEqual([])
  expect((await store.sites.get('quern-hill'))?.turbines?.length).toBe(1)
})

test('who reads while logs come in and are merged sees whole logs, and all that were acknowledged', async () => {
  const store = await siteStore(undefined, { mergeCount: 2, largeRows: 1_000 })
  let acknowledged = 0
  let isWriting = true
  const write = async () => {
    for (let n = 0; n < 30; n++) {
      await addRows(store, 'quern-hill', [
        ['Q01', MARCH + n * STEP, n],
        ['Q01', APRIL + n * STEP, n],
      ])
      acknowledged = n + 1
    }
    isWriting = false
  }
  let reads = 0
  const read = async () => {
    while (isWriting) {
      const least = acknowledged
      const times = (await store.logs.rows('quern-hill'))[0]?.numbers['power'] ?? []
      const half = times.length / 2
      expect(half).toBeGreaterThanOrEqual(least)
      expect(Array.from(times)).toEqual(Array.from({ length: 2 * half }, (_, i) => i % half))
      reads++
    }
  }
  await Promise.all([write(), read(), read()])
  expect(reads).toBeGreaterThan(3)
})

test('rejected rows are kept with their log and go with it', async () => {
  const store = await siteStore()
  const rejectedPath = join(store.tempFolder, 'rejected.csv')
  await writeFile(rejectedPath, 'line,reason,text\n3,no time,x\n')
  const { batch } = await addRows(store, 'quern-hill', [['Q01', MARCH, 1]], { rejectedPath })
  const kept = (await store.logs.rejectedPath('quern-hill', batch.batch))!
  expect(await readFile(kept, 'utf8')).toBe('line,reason,text\n3,no time,x\n')
  await store.logs.remove('quern-hill', batch.batch)
  expect(existsSync(kept)).toBe(false)
  const clean = await addRows(store, 'quern-hill', [['Q01', MARCH, 1]])
  expect(await store.logs.rejectedPath('quern-hill', clean.batch.batch)).toBeNull()
})

test('sites and logs that are not there are named as such', async () => {
  const store = await siteStore()
  const siteMissing = expect.objectContaining({ code: 'SITE_NOT_FOUND' }) as Error
  const batchMissing = expect.objectContaining({ code: 'BATCH_NOT_FOUND' }) as Error
  await expect(addRows(store, 'elsewhere', [['Q01', MARCH, 1]])).rejects.toThrow(siteMissing)
  await expect(store.logs.readWindow('elsewhere')).rejects.toThrow(siteMissing)
  await expect(store.logs.list('elsewhere', { limit: 1 })).rejects.toThrow(siteMissing)
  await expect(store.logs.get('quern-hill', 'x')).rejects.toThrow(batchMissing)
  await expect(store.logs.remove('quern-hill', 'x')).rejects.toThrow(batchMissing)
  await expect(store.logs.rejectedPath('elsewhere', 'x')).rejects.toThrow(siteMissing)
})

test('logs are listed from newest to oldest, page by page', async () => {
  const store = await siteStore()
  const added: string[] = []
  for (let i = 0; i < 5; i++)
    added.unshift((await addRows(store, 'quern-hill', [['Q01', MARCH + i, 1]])).batch.batch)
  const seen: string[] = []
  let after: string | undefined
  do {
    const page = await store.logs.list('quern-hill', { limit: 2, ...(after === undefined ? {} : { after }) })
    seen.push(...page.batches.map(({ batch }) => batch))
    after = page.next ?? undefined
  } while (after !== undefined)
  expect(seen).toEqual(added)
})

test('a site goes with its logs and files, and leaves other sites alone', async () => {
  const folder = await makeFolder()
  const store = await siteStore(folder)
  await store.sites.put('mill-moor', {})
  await addRows(store, 'quern-hill', [['Q01', MARCH, 1]])
  await addRows(store, 'mill-moor', [['Q01', MARCH, 2]])
  expect(await store.logs.removeSite('quern-hill')).toBe(true)
  expect(await store.logs.removeSite('quern-hill')).toBe(false)
  expect(await store.sites.get('quern-hill')).toBeUndefined()
  expect(await readRows(store, 'mill-moor')).toEqual([['Q01', MARCH, 2]])
  await store.sites.put('quern-hill', {})
  expect(await readRows(store, 'quern-hill')).toEqual([])
  await store.close()
  expect((await readdir(join(folder, 'segments'))).length).toBe(1)
})

test('days count every time once, however often it was posted', async () => {
  const store = await siteStore()
  const day = 86_400_000
  await addRows(store, 'quern-hill', [
    ['Q01', MARCH - 1, 1],
    ['Q01', MARCH, 1],
    ['Q01', MARCH + STEP, 1],
    ['Q02', MARCH, 1],
  ])
  await addRows(store, 'quern-hill', [
    ['Q01', MARCH + STEP, 2],
    ['Q01', MARCH + day, 2],
  ])
  expect(await store.logs.days('quern-hill', 'Q01')).toEqual([
    { dayMs: MARCH - day, rows: 1, firstMs: MARCH - 1, lastMs: MARCH - 1 },
    { dayMs: MARCH, rows: 2, firstMs: MARCH, lastMs: MARCH + STEP },
    { dayMs: MARCH + day, rows: 1, firstMs: MARCH + day, lastMs: MARCH + day },
  ])
  const rows = await store.logs.rows('quern-hill', { fromMs: MARCH, turbines: ['Q01'] })
  expect(rows.map(({ turbine, time, numbers }) => [turbine, [...time], [...numbers['power']!]])).toEqual([
    ['Q01', [MARCH, MARCH + STEP, MARCH + day], [1, 2, 2]],
  ])
  expect(await store.logs.days('quern-hill', 'Q09')).toEqual([])
  expect(await store.logs.extents('quern-hill')).toEqual([
    { turbine: 'Q01', firstMs: MARCH - 1, lastMs: MARCH + day },
    { turbine: 'Q02', firstMs: MARCH, lastMs: MARCH },
  ])
})

test('a log beyond the limit of the folder is refused whole, and what was stored is read', async () => {
  const folder = await makeFolder()
  const store = await siteStore(folder)
  const rows: LogRow[] = Array.from({ length: 50 }, (_, i) => ['Q01', MARCH + i * STEP, i] as const)
  await addRows(store, 'quern-hill', rows)
  await store.close()
  const used = (await readFile(join(folder, 'segments', (await readdir(join(folder, 'segments')))[0]!)))
    .length
  const full = await openTestStore(folder, { limitBytes: Math.floor(used * 2.5), newId: newIds('b') })
  const months: LogRow[] = [...rows, ...rows.map(([t, ms, p]) => [t, ms + (APRIL - MARCH), p] as const)]
  // The first month would fit, the second does not: neither is kept.
  await expect(addRows(full, 'quern-hill', months)).rejects.toThrow(
    expect.objectContaining({ code: 'STORAGE_FULL' }) as Error,
  )
  expect(await readRows(full, 'quern-hill')).toEqual(rows)
  expect((await full.logs.list('quern-hill', { limit: 10 })).batches.length).toBe(1)
  await full.close()
  expect((await readdir(join(folder, 'segments'))).length).toBe(1)
})

test('any sequence of posts, deletions and merges answers as a plain list of batches would', async () => {
  const store = await siteStore(undefined, { mergeCount: 3, largeRows: 40 })
  const turbine = fc.constantFrom('Q01', 'Q02', 'q3')
  const row = fc.tuple(turbine, fc.integer({ min: -6, max: 6 }), fc.integer({ min: 0, max: 99 }))
  const step = fc.oneof(
    {
      weight: 6,
      arbitrary: fc.record({ add: fc.array(row, { minLength: 1, maxLength: 8 }) }),
    },
    { weight: 3, arbitrary: fc.record({ remove: fc.nat() }) },
    { weight: 2, arbitrary: fc.constant({ compact: true as const }) },
    {
      weight: 3,
      arbitrary: fc.record({
        read: fc.tuple(fc.integer({ min: -7, max: 7 }), fc.integer({ min: -7, max: 8 })),
      }),
    },
  )
  let site = 0
  await fc.assert(
    fc.asyncProperty(fc.array(step, { minLength: 4, maxLength: 25 }), async (steps) => {
      const name = `site-${++site}`
      await store.sites.put(name, {})
      const model: { batch: string; rows: LogRow[] }[] = []
      const winners = (fromMs: number, toMs: number): LogRow[] => {
        const byKey = new Map<string, LogRow>()
        for (const { rows } of model) for (const one of rows) byKey.set(JSON.stringify([one[0], one[1]]), one)
        return [...byKey.values()]
          .filter(([, time]) => time >= fromMs && time < toMs)
          .sort((a, b) => (a[0] === b[0] ? a[1] - b[1] : a[0] < b[0] ? -1 : 1))
      }
      for (const one of steps) {
        if ('add' in one) {
          const unique = new Map(one.add.map(([t, k, p]) => [`${t} ${k}`, [t, APRIL + k * STEP, p] as const]))
          const rows = [...unique.values()]
          model.push({ batch: (await addRows(store, name, rows)).batch.batch, rows })
        } else if ('remove' in one && model.length > 0) {
          const [gone] = model.splice(one.remove % model.length, 1)
          await store.logs.remove(name, gone!.batch)
        } else if ('compact' in one) {
          await store.logs.compact()
        } else if ('read' in one) {
          const [fromMs, toMs] = [APRIL + one.read[0] * STEP, APRIL + one.read[1] * STEP]
          expect(await readRows(store, name, { fromMs, toMs })).toEqual(winners(fromMs, toMs))
        }
      }
      expect(await readRows(store, name)).toEqual(winners(-Infinity, Infinity))
    }),
    { numRuns: 25 },
  )
}, 180_000)

test('on a full disk a log is refused whole, what was stored is read, and posts go on when there is room again', async (context) => {
  const folder = await makeSmallDisk(16)
  if (!folder) {
    context.skip('this user may not mount a small disk')
    return
  }
  const store = await openStore({ folder, clock: () => 1, newId: counter(), keepFreeBytes: 0 })
  const ballast = join(folder, 'ballast')
  try {
    await store.sites.put('quern-hill', { turbines: [{ turbine: 'Q01' }] })
    // 52 bits without a pattern: at least 6 bytes a number in any encoding, so 30 kB a log, far more than is left free.
    const random = createRandom(1)
    const noise = () => random.uint32() * 2 ** 20 + (random.uint32() >>> 12)
    const logs = [0, 1].map((n) =>
      Array.from({ length: 5_000 }, (_, i) => ['Q01', MARCH + n * 1e8 + i * 1000, noise()] as const),
    )
    const log = (n: number): LogRow[] => logs[n]!
    await addRows(store, 'quern-hill', log(0))
    const before = await readdir(join(folder, 'segments'))
    const staged = await stageRows(store, log(1))
    const { bavail, bsize } = await statfs(folder)
    await writeFile(ballast, Buffer.alloc(bavail * bsize - 8192))
    const post = {
      site: 'quern-hill',
      path: staged,
      rejectedPath: null,
      receipt: receiptOf(5_000),
      reading: {},
    }
    await expect(store.logs.add({ ...post, contentKey: 'b' })).rejects.toThrow(
      expect.objectContaining({ code: 'STORAGE_FULL' }) as Error,
    )
    const [stored] = await store.logs.rows('quern-hill')
    expect(Array.from(stored!.numbers['power']!)).toEqual(log(0).map(([, , power]) => power))
    await expect(store.logs.readWindow('quern-hill')).rejects.toThrow(
      expect.objectContaining({ code: 'STORAGE_FULL' }) as Error,
    )
    await store.ready()
    await rm(ballast)
    expect(await readdir(join(folder, 'segments'))).toEqual(before)
    expect((await store.logs.add({ ...post, contentKey: 'b' })).isNew).toBe(true)
    expect(await readRows(store, 'quern-hill')).toEqual([...log(0), ...log(1)])
    expect(await store.logs.verify()).toEqual([])
  } finally {
    await store.close()
  }
})

test('a large log is taken as it is, and overrules and is overruled like any other', async () => {
  const store = await siteStore(undefined, { mergeCount: 2, largeRows: 10_000_000 })
  // A million seconds that begin in the last hour of a month.
  const fromMs = MARCH - 3_600_000
  const large = async (power: number) => {
    const path = join(store.tempFolder, `large-${power}.parquet`)
    await store.scans.withConnection((connection) =>
      writeParquet(
        connection,
        `SELECT 'Q01' AS turbine, (${fromMs} + i * 1000)::BIGINT AS time, ${power}::DOUBLE AS power,
           i::DOUBLE AS vane FROM range(1000000) r(i)`,
        path,
      ),
    )
    const post = { site: 'quern-hill', path, rejectedPath: null, receipt: receiptOf(1_000_000), reading: {} }
    const added = await store.logs.add({ ...post, contentKey: `large-${power}` })
    expect(existsSync(path)).toBe(false)
    return added.batch.batch
  }
  const window = { fromMs: MARCH - 1000, toMs: MARCH + 1001 }
  const seen = async () => (await readRows(store, 'quern-hill', window)).map(([, , power]) => power)
  await addRows(store, 'quern-hill', [['Q01', MARCH + 1000, 1]])
  expect(await seen()).toEqual([1])
  const first = await large(2)
  expect(await seen()).toEqual([2, 2, 2])
  await addRows(store, 'quern-hill', [['Q01', MARCH, 3]])
  const second = await large(4)
  expect(await seen()).toEqual([4, 4, 4])
  expect((await store.logs.days('quern-hill', 'Q01')).reduce((sum, { rows }) => sum + rows, 0)).toBe(
    1_000_000,
  )
  // The two large ones are merged here, although their files do not say which batch their rows are of.
  await store.logs.compact()
  expect(await seen()).toEqual([4, 4, 4])
  await store.logs.remove('quern-hill', second)
  expect(await seen()).toEqual([2, 3, 2])
  await store.logs.compact()
  expect(await seen()).toEqual([2, 3, 2])
  await store.logs.remove('quern-hill', first)
  expect(await seen()).toEqual([3, 1])
  await store.logs.compact()
  expect(await seen()).toEqual([3, 1])
})

function newIds(prefix: string): () => string {
  let n = 0
  return () => `${prefix}${++n}`
}

async function siteStore(
  folder?: string,
  compaction = { mergeCount: 1_000, largeRows: 1_000_000 },
  report: (error: unknown) => void = (error) => {
    throw error instanceof Error ? error : new Error(String(error))
  },
): Promise<Store> {
  const store = await openTestStore(folder ?? (await makeFolder()), { compaction, report })
  await store.sites.put('quern-hill', { turbines: [{ turbine: 'Q01', ratedPowerKw: 2300 }] })
  return store
}

test('a window says which logs it draws on, and how many of its rows a later log overruled', async () => {
  const store = await openTestStore(await makeFolder())
  await store.sites.put('quern-hill', { turbines: [{ turbine: 'A' }] })
  const first = await addRows(store, 'quern-hill', [
    ['A', 0, 1],
    ['A', 600_000, 2],
    ['A', 1_200_000, 3],
  ])
  const second = await addRows(store, 'quern-hill', [['A', 600_000, 5]])
  const whole = await store.logs.readWindow('quern-hill')
  expect(whole).toMatchObject({ rows: 3, overruled: 1 })
  expect(whole.batches.map(({ batch }) => batch)).toEqual([first.batch.batch, second.batch.batch])
  const end = await store.logs.readWindow('quern-hill', { fromMs: 1_200_000 })
  expect(end).toMatchObject({ rows: 1, overruled: 0 })
  expect(end.batches.map(({ batch }) => batch)).toEqual([first.batch.batch])
})

test('a window names its logs also where their numbers are far apart and those between are of another site', async () => {
  const store = await openTestStore(await makeFolder())
  for (const site of ['quern-hill', 'mill-moor'])
    await store.sites.put(site, { turbines: [{ turbine: 'A' }] })
  const expected: string[] = []
  for (let n = 0; n < 3; n++) {
    expected.push((await addRows(store, 'quern-hill', [['A', n * STEP, n]])).batch.batch)
    await addRows(store, 'mill-moor', [['A', n * STEP, n]])
    // A log that fails has used up its number all the same.
    const gone = { site: 'mill-moor', path: join(store.tempFolder, 'gone.parquet'), rejectedPath: null }
    for (let i = 0; i < (n === 1 ? 70 : 0); i++) {
      const add = store.logs.add({ ...gone, receipt: receiptOf(1), reading: {}, contentKey: `${n} ${i}` })
      await expect(add).rejects.toThrow(/gone\.parquet/)
    }
  }
  const { batches } = await store.logs.readWindow('quern-hill')
  expect(batches.map(({ batch }) => batch)).toEqual(expected)
  const seqs = batches.map(({ seq }) => seq)
  expect(seqs[2]! - seqs[1]!).toBeGreaterThan(64)
})
