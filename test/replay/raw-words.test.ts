import { expect, onTestFinished, test } from 'vitest'
import { grayFromBinary } from '../../src/kernel/decode/index.ts'
import type { SiteFile } from '../../src/sheet/index.ts'
import { SETTINGS } from '../frame/settings.ts'
import {
  DEMO_SITE,
  demoRequest,
  demoText,
  makeFolder,
  openService,
  removeFolder,
  turbineOf,
  writeLog,
} from './farm.ts'

const KNOWN = { assumedResponsePctPerDeg: 0 }
const BITS = 12
const STEP_DEG = 360 / 2 ** BITS

async function service() {
  const folder = await makeFolder()
  onTestFinished(() => removeFolder(folder))
  const opened = await openService(folder)
  onTestFinished(() => opened.close())
  return { ...opened, folder }
}

/** Two weeks of two turbines in the demo log; `vaneOf` writes the vane of a row anew. */
function demoRows(vaneName: string, vaneOf: (vane: string) => string): string {
  const [header, ...rows] = demoText().trimEnd().split('\n') as [string, ...string[]]
  const names = header.split(',')
  const at = names.indexOf('vane')
  names[at] = vaneName
  const kept = rows
    .filter((row) => /^2026-03-(0\d|1[0-4])[^,]*,Q0[46],/.test(row))
    .map((row) => {
      const cells = row.split(',')
      cells[at] = cells[at] === '' ? '' : vaneOf(cells[at]!)
      return cells.join(',')
    })
  return [names.join(','), ...kept, ''].join('\n')
}

/** Code of a disc that reads 0 at -180 degrees. */
const codeOf = (vane: string): number => Math.round((Number(vane) + 180) / STEP_DEG) % 2 ** BITS
const roundedVane = (vane: string): string => String(codeOf(vane) * STEP_DEG - 180)

const siteWith = (vane: Record<string, unknown>): SiteFile => ({
  ...DEMO_SITE,
  turbines: DEMO_SITE.turbines!.map((setup) => ({ ...setup, vane: { ...setup.vane, ...vane } })),
})

test('a vane logged as Gray code scores as its decoded angles do', async () => {
  const { replays, folder } = await service()
  const angles = await writeLog(folder, 'angles.csv', demoRows('vane', roundedVane))
  const words = await writeLog(
    folder,
    'words.csv',
    demoRows('vane_code', (vane) => String(grayFromBinary(codeOf(vane)))),
  )
  const plain = await replays.oneShot(demoRequest(KNOWN, { logs: [angles] }))
  const coded = await replays.oneShot(
    demoRequest(KNOWN, { logs: [words], site: siteWith({ bits: BITS, zeroDeg: -180 }) }),
  )
  for (const name of ['Q04', 'Q06']) {
    const [expected, got] = [turbineOf(plain, name), turbineOf(coded, name)]
    expect(expected.staticOffset.estimateDeg).not.toBeNull()
    // Decoding leaves rounding of 1e-13 degrees.
    expect(got.staticOffset.estimateDeg! - expected.staticOffset.estimateDeg!).toBeCloseTo(0, 8)
    expect(got.vane.meanDeg! - expected.vane.meanDeg!).toBeCloseTo(0, 9)
    expect(got.rows.used).toBe(expected.rows.used)
  }
})

test('words that nobody describes are refused where they are the only vane, and named', async () => {
  const { replays, folder } = await service()
  const words = await writeLog(
    folder,
    'words.csv',
    demoRows('vane_code', (vane) => String(codeOf(vane))),
  )
  const refused = replays.oneShot(demoRequest(KNOWN, { logs: [words] }))
  await expect(refused).rejects.toMatchObject({ code: 'LOG_COLUMNS_MISSING' })
  await expect(refused).rejects.toThrow('vane.bits')
})

test('words beside a vane that is logged are only warned of', async () => {
  const { replays, folder } = await service()
  const [header, ...rows] = demoRows('vane', (vane) => vane)
    .trimEnd()
    .split('\n') as [string, ...string[]]
  const text = [`${header},nacelle_code`, ...rows.map((row) => `${row},17`), ''].join('\n')
  const log = await writeLog(folder, 'both.csv', text)
  const sheet = await replays.oneShot(demoRequest(KNOWN, { logs: [log] }))
  expect(sheet.warnings.filter((line) => line.includes('nacelle_code'))).toEqual([
    expect.stringContaining('Q04: nacelle_code in the log cannot be read'),
    expect.stringContaining('Q06: nacelle_code in the log cannot be read'),
  ])
})

/** Six hours at 1 Hz of a nacelle that turns to and fro over three turns; counts of a quarter degree, an index every 90 degrees. */
function pulseLog(lostCounts: number): string {
  const perTurn = 360
  const lines = ['time,turbine,wind_speed,vane,power,pulse_a,pulse_b,pulse_z']
  const cycle = ['0,0', '0,1', '1,1', '1,0']
  for (let second = 0; second < 6 * 3600; second++) {
    const ramp = Math.abs(((second / 4 + 3000) % 6000) - 3000)
    const count = 10 + Math.floor(ramp) + (second > 9000 ? lostCounts : 0)
    const time = new Date(Date.UTC(2026, 2, 1, 0, 0, second)).toISOString()
    const vane = 3 * Math.sin(second / 40)
    const isIndex = count % perTurn <= 1 ? 1 : 0
    lines.push(`${time},Q01,8,${vane.toFixed(2)},900,${cycle[count % 4]!},${isIndex}`)
  }
  return `${lines.join('\n')}\n`
}

test('pulses are counted to a nacelle position, and those that went missing are found', async () => {
  const { replays, folder } = await service()
  const site: SiteFile = {
    turbines: [{ turbine: 'Q01', nacelle: { pulsesPerTurn: 90, gearRatio: 4 } }],
  }
  const positionsOf = async (lostCounts: number) => {
    const log = await writeLog(folder, `pulses-${lostCounts}.csv`, pulseLog(lostCounts))
    const sheet = await replays.oneShot({ logs: [log], site, reading: {}, settings: SETTINGS })
    const csv = await new Response((await replays.rows(sheet.replay, 'csv')).stream as never).text()
    const [header, ...rows] = csv
      .trimEnd()
      .split('\n')
      .map((line) => line.split(','))
    const at = header!.indexOf('nacelle_position_max')
    const findings = turbineOf(sheet, 'Q01').sensors.filter(({ kind }) => kind === 'missing-pulses')
    return { highest: rows.map((row) => Number(row[at])), findings }
  }
  const sound = await positionsOf(0)
  expect(sound.findings).toEqual([])
  // Ten minutes are 150 counts of a quarter degree; the first row is 0. By hand.
  expect(sound.highest.slice(0, 3)).toEqual([37.25, 74.75, 112.25])

  const lossy = await positionsOf(8)
  expect(lossy.findings).toMatchObject([
    {
      sensor: 'nacelle-position',
      severity: 'warn',
      detail: { indexErrors: 1, missedCounts: 8, missedDeg: 2 },
    },
  ])
})
