import { mkdtemp, readdir, readFile, rm, writeFile } from 'node:fs/promises'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { gunzipSync } from 'node:zlib'
import { afterEach, beforeEach, expect, test } from 'vitest'
import { runCli } from './run-cli.ts'

const LOG = 'time,turbine,wind_speed\n2026-03-01T00:00:00Z,Q01,8.1\n'
let folder: string
let log: string

beforeEach(async () => {
  folder = await mkdtemp(join(tmpdir(), 'yawledger-cli-test-'))
  log = join(folder, 'march.csv')
  await writeFile(log, LOG)
})
afterEach(async () => {
  await rm(folder, { recursive: true, force: true })
})

test('without --out the score sheet alone stands on standard output', async () => {
  const { status, out, err, closed } = await runCli(['replay', log])
  expect(status).toBe(0)
  expect(JSON.parse(out)).toMatchObject({ replay: 'replay-1', site: 'quern-hill' })
  expect(err).toBe('')
  expect(closed).toBe(1)
})

test('with --out the sheet is written, and a summary of at most 120 columns is printed', async () => {
  const out = join(folder, 'deep', 'out')
  const ran = await runCli(['replay', log, '--out', out])
  expect(ran.status).toBe(0)
  expect(await readdir(out)).toEqual(['score-sheet.json'])
  const sheet = JSON.parse(await readFile(join(out, 'score-sheet.json'), 'utf8')) as { replay: string }
  expect(sheet.replay).toBe('replay-1')
  expect(ran.out).toContain('+6.1 [+4.7, +7.5]')
  expect(ran.out).toContain('81 [40, 121]')
  expect(ran.out).toContain('1.35')
  expect(ran.out).toContain('4464 received = 4460 accepted + 1 duplicate + 3 rejected; 2110 used')
  expect(ran.out).toContain(`written: ${join(out, 'score-sheet.json')}`)
  const lines = ran.out.split('\n').filter((line) => !line.startsWith('written: '))
  expect(Math.max(...lines.map((line) => line.length))).toBeLessThanOrEqual(120)
})

test('csv tables are written beside the sheet when asked for', async () => {
  const ran = await runCli(['replay', log, '--out', folder, '--format', 'json,csv'])
  expect(ran.status).toBe(0)
  const [header, row] = (await readFile(join(folder, 'worklist.csv'), 'utf8')).split('\n')
  expect(header).toMatch(
    /^rank,turbine,standingMisalignmentDeg,addToVaneDeg,expectedAnnualMwh,lowerMwh,upperMwh,why,checkFirst,cautions,.*,asFoundDeg,asLeftDeg,changedAt,by,note$/,
  )
  expect(row).toMatch(
    /^1,Q01,6\.1,,81\.2,40\.1,120\.9,stands off by 6\.1 degrees,the sign of the vane,.*,,,,,$/,
  )
  expect(await readFile(join(folder, 'set-aside.csv'), 'utf8')).toBe(
    'turbine,reason,rows\nQ01,not-running,2350\n',
  )
})

test('rows are written whole, in the form that the name of the file tells', async () => {
  for (const format of ['csv', 'parquet', 'arrow']) {
    const path = join(folder, 'deep', `rows.${format}`)
    const { status, err } = await runCli(['replay', log, '--rows', path])
    expect(err).toBe('')
    expect(status).toBe(0)
    expect(await readFile(path, 'utf8')).toBe(`rows of replay-1 as ${format}\n`)
  }
  expect(await readdir(join(folder, 'deep'))).toEqual(['rows.arrow', 'rows.csv', 'rows.parquet'])
})

test('a dry run prints how each log would be read, and scores nothing', async () => {
  const { openStore } = await import('../../src/store/index.ts')
  const { createIntake } = await import('../../src/intake/index.ts')
  const { DEFAULT_LIMITS } = await import('../../src/log/index.ts')
  let ids = 0
  const newId = () => `id-${++ids}`
  const store = await openStore({ folder: join(folder, 'store'), clock: () => 0, newId })
  try {
    await writeFile(log, 'time;turbine;wind_speed;note\n2026-03-01T00:00:00Z;Q01;8,1;x\n')
    const intake = createIntake({ store, limits: DEFAULT_LIMITS, newId })
    const args = ['replay', log, '--dry-run', '--timezone', 'Europe/Berlin', '--out', join(folder, 'none')]
    const { status, out, replays } = await runCli(args, { intake })
    expect(status).toBe(0)
    expect(out).toContain('march.csv\n')
    expect(out).toContain('delimiter ";", decimal comma true, header in line 1')
    expect(out).toContain('zone Europe/Berlin')
    expect(out).toMatch(/ {4}wind_speed: wind_speed in m\/s \(/)
    expect(out).toMatch(/ {4}note: not used/)
    expect(out).toMatch(/missing, and wanted by the scoring:\n {4}vane\n {4}power\n/)
    expect(replays.requests).toHaveLength(0)
    expect(await readdir(folder)).toEqual(['march.csv', 'store'])
  } finally {
    await store.close()
  }
})

test('- reads standard input', async () => {
  const { status, replays } = await runCli(['replay', '-'], { stdin: LOG })
  expect(status).toBe(0)
  expect(replays.requests[0]?.logs[0]?.name).toBe('standard input')
  expect(replays.bodies[0]?.[0]?.toString()).toBe(LOG)
})

test('flags reach the reading, the settings and the rated power', async () => {
  const columns = join(folder, 'columns.json')
  await writeFile(columns, '{"power":{"column":"P","unit":"W"}}')
  const site = join(folder, 'farm.site.json')
  await writeFile(site, '{"site":"quern-hill"}')
  const flags = [
    '--timezone',
    'Europe/Berlin',
    '--stamp',
    'end',
    '--turbine',
    'Q01',
    '--start-date',
    '2026-03-01',
  ]
  const numbers = [
    '--rated-power',
    '2300',
    '--exponent',
    '2.5',
    '--assume-response',
    '-0.3',
    '--threshold',
    '4',
  ]
  const more = ['--columns', columns, '--site', site, '--set', 'windMinMs=6', '--threads', '2']
  const ran = await runCli(['replay', log, ...flags, ...numbers, ...more])
  expect(ran.err).toBe('')
  expect(ran.replays.requests[0]).toMatchObject({
    reading: {
      timezone: 'Europe/Berlin',
      stamp: 'end',
      turbine: 'Q01',
      startDate: '2026-03-01',
      columns: { power: { column: 'P', unit: 'W' } },
    },
    ratedPowerKw: 2300,
    site: { site: 'quern-hill' },
  })
  expect(ran.settings[0]).toEqual({
    exponent: { flag: '--exponent', value: '2.5' },
    assumedResponsePctPerDeg: { flag: '--assume-response', value: '-0.3' },
    actionThresholdDeg: { flag: '--threshold', value: '4' },
    scoreThreads: { flag: '--threads', value: '2' },
    windMinMs: { flag: '--set windMinMs', value: '6' },
  })
})

test.each([
  [['replay'], 'error BAD_OPTION: missing required argument'],
  [['replay', 'LOG', '--no-such'], "error BAD_OPTION: unknown option '--no-such'"],
  [['fly'], "error BAD_OPTION: unknown command 'fly'"],
  [['replay', 'nowhere.csv'], 'error LOG_NOT_FOUND: nowhere.csv: expected a log file, got no such file'],
  [['replay', tmpdir()], 'expected a log file, got a folder'],
  [['replay', 'LOG', '--format', 'html', '--out', 'x'], '--format: expected json or csv, got "html"'],
  [['replay', 'LOG', '--rows', 'rows.xlsx'], '--rows: expected a name that ends with .csv, .parquet, .arrow'],
  [['replay', 'LOG', '--date-order', 'ydm'], '--date-order: expected "ymd" or "dmy" or "mdy", got "ydm"'],
  [['replay', 'LOG', '--format', 'csv'], '--format: expected --out with csv'],
  [['replay', 'LOG', '--stamp', 'middle'], '--stamp: expected "begin" or "end", got "middle"'],
  [
    ['replay', 'LOG', '--rated-power', 'big'],
    '--rated-power: expected a number above 0 up to 50000, got "big"',
  ],
  [['replay', 'LOG', '--columns', '{"a'], '--columns: expected a JSON object or a file with one'],
  [['replay', 'LOG', '--columns', 'none.json'], 'got no such file'],
  [
    ['replay', 'LOG', '--site', 'none.json'],
    'error BAD_SITE: none.json: expected a site file, got no such file',
  ],
  [['replay', '-', '-'], 'expected standard input once'],
  [['simulate'], "required option '--out <folder>' not specified"],
  [['simulate', '--out', 'x', '--turbines', 'many'], '--turbines: expected a whole number, got "many"'],
  [['simulate', '--out', 'x', '--demo', '--seed', '2'], '--demo: expected no --seed beside it'],
])('%j is wrong use: status 2, one line, no stack', async (args, message) => {
  const { status, out, err, replays } = await runCli(args.map((one) => (one === 'LOG' ? log : one)))
  expect(status).toBe(2)
  expect(err).toContain(message)
  expect(err.trimEnd().split('\n').length).toBeLessThanOrEqual(2)
  expect(err).not.toMatch(/\n\s+at /)
  expect(out).toBe('')
  expect(replays.requests).toHaveLength(0)
})

test('a site file that does not fit is named with its place', async () => {
  const site = join(folder, 'farm.site.json')
  await writeFile(site, '{"turbines":[{"turbine":"Q01","ratedPowerKw":-1}]}')
  const { status, err } = await runCli(['replay', log, '--site', site])
  expect(status).toBe(2)
  expect(err).toContain('error BAD_SITE: farm.site.json.turbines[0].ratedPowerKw: expected a number above 0')
})

test('help explains commands, units, sign, exit status and gives examples', async () => {
  for (const args of [['--help'], ['replay', '--help'], ['serve', '--help'], ['simulate', '--help']]) {
    const { status, out } = await runCli(args)
    expect(status).toBe(0)
    expect(out).toContain('Examples:')
    expect(out).toContain('Exit status: 0 done, 1 failed, 2 wrong use.')
  }
  const { out } = await runCli(['replay', '--help'])
  expect(out).toContain('further clockwise')
  expect((await runCli(['--version'])).out).toBe('0.1.0\n')
  const bare = await runCli([])
  expect(bare.status).toBe(2)
  expect(bare.err).toContain('Usage: yawledger')
})

test('serve hands its flags on', async () => {
  const { status, served } = await runCli(['serve', '--port', '9000', '--data', '/srv/yaw'])
  expect(status).toBe(0)
  expect(served).toEqual([
    { port: { flag: '--port', value: '9000' }, dataFolder: { flag: '--data', value: '/srv/yaw' } },
  ])
})

test('simulate writes a log that the same seed writes again', async () => {
  const texts: string[] = []
  for (const name of ['a', 'b']) {
    const out = join(folder, name)
    const args = [
      'simulate',
      '--out',
      out,
      '--turbines',
      '2',
      '--days',
      '1',
      '--seed',
      '7',
      '--start',
      '2026-05-01',
    ]
    const { status, out: said } = await runCli(args)
    expect(status).toBe(0)
    expect(said).toContain('Invented data')
    const csv = (await readdir(out)).find((one) => one.endsWith('2026-05.csv.gz')) ?? ''
    texts.push(gunzipSync(await readFile(join(out, csv))).toString())
  }
  expect(texts[0]).toBe(texts[1])
  // Two turbines, 144 rows of ten minutes each, one header.
  expect(texts[0]?.trimEnd().split('\n')).toHaveLength(289)
})

test('simulate puts faults and corrections into the farm, its truth and its site file', async () => {
  const out = join(folder, 'faulty')
  const given = [
    '--fault',
    'Q02:anemometer-gain:2026-03-01:2026-03-02:0.8',
    '--correction',
    'Q01:2026-03-01:5',
  ]
  const { status, err } = await runCli(['simulate', '--out', out, '--turbines', '2', '--days', '1', ...given])
  expect(err).toBe('')
  expect(status).toBe(0)
  const read = async (name: string) =>
    JSON.parse(await readFile(join(out, name), 'utf8')) as { faults: object[]; corrections: object[] }
  const truth = await read('quern-hill.truth.json')
  expect(truth.faults).toMatchObject([{ turbine: 'Q02', kind: 'anemometer-gain', size: 0.8 }])
  expect((await read('quern-hill.site.json')).corrections).toEqual([
    { turbine: 'Q01', at: '2026-03-01T00:00:00.000Z', enteredDeg: 5 },
  ])
})
