import { mkdtemp, readdir, rm, writeFile } from 'node:fs/promises'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterEach, beforeEach, expect, test } from 'vitest'
import {
  duckFailure,
  openFile,
  openScans,
  quoteIdentifier,
  quoteText,
  readColumns,
  streamColumns,
  writeParquet,
} from '../../src/duck/index.ts'

let folder = ''
beforeEach(async () => {
  folder = await mkdtemp(join(tmpdir(), 'duck-'))
})
afterEach(() => rm(folder, { recursive: true, force: true }))

const scans = () => openScans({ folder, memoryMb: 200, threads: 2 })

test('a NULL is NaN in numbers and null in text, whatever the vector held before', async () => {
  const db = await scans()
  const read = await db.withConnection((c) =>
    readColumns(
      c,
      `(SELECT r, CASE WHEN r % 3 = 0 THEN NULL ELSE r * 0.5 END AS half,
         CASE WHEN r % 2 = 0 THEN NULL ELSE 'T' || (r % 4) END AS name FROM range(5000) t(r))`,
      { half: 'number', name: 'text' },
      { orderBy: 'r' },
    ),
  )
  expect(read.rows).toBe(5000)
  expect(read.columns.half).toHaveLength(5000)
  read.columns.half.forEach((value, r) => {
    expect(value, `row ${r}`).toBe(r % 3 === 0 ? NaN : r * 0.5)
  })
  expect(read.columns.name.slice(0, 4)).toEqual([null, 'T1', null, 'T3'])
  await db.close()
})

test('epoch milliseconds pass exactly', async () => {
  const db = await scans()
  const time = 1_772_323_200_001
  const { columns } = await db.withConnection((c) =>
    readColumns(c, '(SELECT $1::BIGINT AS time)', { time: 'number' }, { values: [time] }),
  )
  expect(columns.time[0]).toBe(time)
  await db.close()
})

test('names and texts with quotes are read as they are', async () => {
  const db = await scans()
  const name = 'wind "speed"; DROP'
  const { columns } = await db.withConnection((c) =>
    readColumns(c, `(SELECT ${quoteText("o'clock")} AS ${quoteIdentifier(name)})`, { [name]: 'text' }),
  )
  expect(columns[name]).toEqual(["o'clock"])
  expect(() => quoteIdentifier('a\0b')).toThrow('NUL')
  await db.close()
})

test('files outside the allowed folders are refused and the settings cannot be changed back', async () => {
  const db = await scans()
  const other = await mkdtemp(join(tmpdir(), 'duck-other-'))
  await writeFile(join(other, 'x.csv'), 'a\n1\n')
  await db.withConnection(async (c) => {
    await expect(c.records(`SELECT * FROM read_csv(${quoteText(join(other, 'x.csv'))})`)).rejects.toThrow(
      /Permission/,
    )
    await expect(c.run('SET enable_external_access = true')).rejects.toThrow()
    await expect(c.run('SET threads = 64')).rejects.toThrow(/locked/)
    await expect(c.run('INSTALL httpfs')).rejects.toThrow()
  })
  await rm(other, { recursive: true })
  await db.close()
})

test('rows go to Parquet and come back in their order, chunk by chunk', async () => {
  const db = await scans()
  const path = join(folder, "it's.parquet")
  await db.withConnection(async (c) => {
    expect(await writeParquet(c, 'SELECT r AS x FROM range(10000) t(r) ORDER BY r DESC', path)).toBe(10_000)
    let next = 9999
    let chunks = 0
    for await (const chunk of streamColumns(c, `read_parquet(${quoteText(path)})`, { x: 'number' })) {
      for (const x of chunk.columns.x) expect(x).toBe(next--)
      chunks++
    }
    expect(next).toBe(-1)
    expect(chunks).toBeGreaterThan(1)
  })
  await db.close()
})

test('a database file keeps its rows over a restart, with external access shut', async () => {
  const bounds = { memoryMb: 200, threads: 2, tempFolder: join(folder, 'temp'), allowedFolders: [] }
  const path = join(folder, 'catalogue.duckdb')
  const first = await openFile(path, bounds)
  await first.withConnection(async (c) => {
    await c.run('CREATE TABLE t (id TEXT PRIMARY KEY, n BIGINT, x DOUBLE, ok BOOLEAN)')
    expect(await c.run('INSERT INTO t VALUES ($1, $2, $3, $4)', ['a', 1_772_323_200_001, 0.5, true])).toBe(1)
    await c.run('CHECKPOINT')
    await c.run('INSERT INTO t VALUES ($1, $2, $3, $4)', ['b', null, null, null])
  })
  await first.close()
  const second = await openFile(path, bounds)
  const rows = await second.withConnection((c) => c.records('SELECT * FROM t ORDER BY id'))
  expect(rows).toEqual([
    { id: 'a', n: 1_772_323_200_001, x: 0.5, ok: true },
    { id: 'b', n: null, x: null, ok: null },
  ])
  await second.close()
  expect(await readdir(folder)).toContain('catalogue.duckdb')
})

test('close waits for the work that runs and refuses later work', async () => {
  const db = await scans()
  const order: string[] = []
  const work = db.withConnection(async (c) => {
    const rows = await c.records('SELECT count(*) AS n FROM range(2000000) t(r) WHERE hash(r) >= 0')
    order.push('work')
    return rows[0]?.['n']
  })
  const closed = db.close().then(() => order.push('closed'))
  expect(await work).toBe(2_000_000)
  await closed
  expect(order).toEqual(['work', 'closed'])
  await expect(db.withConnection(() => Promise.resolve(1))).rejects.toThrow('closed')
})

test('failures are told apart by what the caller must do', () => {
  expect(duckFailure(new Error('IO Error: Could not write file "x": No space left on device'))).toBe(
    'disk-full',
  )
  expect(duckFailure(new Error('FATAL Error: Failed: database has been invalidated'))).toBe('fatal')
  expect(duckFailure(new Error('Out of Memory Error: failed to allocate'))).toBe('out-of-memory')
  expect(duckFailure(new Error('Parser Error'))).toBe('other')
})
