import { existsSync, readFileSync } from 'node:fs'
import { join } from 'node:path'
import { beforeAll, expect, test } from 'vitest'
import { signChecks, type SignCheck } from '../../../src/analysis/sensors/sign-check.ts'
import { buildFrame, type Frame, type TurbineColumns } from '../../../src/frame/index.ts'
import { simulateFarm } from '../../../src/simulate/index.ts'
import type { SiteFile } from '../../../src/sheet/index.ts'
import { SETTINGS } from '../../frame/settings.ts'

type Numbers = Record<string, Float64Array>

const SHARED = join(import.meta.dirname, '..', '..', '..', 'shared', 'data', 'sdwpf-two-days.csv')

let farm: TurbineColumns[]
beforeAll(() => {
  farm = columnsOf(simulateFarm({ seed: 11, turbines: 4, days: 14 }))
})

function columnsOf({ turbines }: ReturnType<typeof simulateFarm>): TurbineColumns[] {
  return turbines.map((turbine) => ({
    turbine: turbine.turbine,
    time: turbine.timeMs,
    numbers: turbine.columns,
    texts: { status: turbine.status },
  }))
}

function frameOf(
  columns: readonly TurbineColumns[],
  turbines: SiteFile['turbines'] = [],
  intervalS = 600,
): Frame {
  return buildFrame(columns, {
    site: { runningStatus: ['run', 'limited'], turbines },
    settings: SETTINGS,
    intervalS,
    ratedPowerKw: 2300,
  })
}

/** The farm with another log of its second turbine. */
function withSecond(change: (numbers: Numbers) => Numbers): TurbineColumns[] {
  return farm.map((columns, k) =>
    k === 1 ? { ...columns, numbers: { ...columns.numbers, ...change(columns.numbers) } } : columns,
  )
}

const reversed = (channel: string) => (numbers: Numbers) => ({
  [channel]: numbers[channel]!.map((angle) => -angle),
})
const bothReversed = (numbers: Numbers) => ({
  ...reversed('vane')(numbers),
  ...reversed('nacelle_position')(numbers),
})
const second = (columns: readonly TurbineColumns[], turbines: SiteFile['turbines'] = []): SignCheck =>
  signChecks(frameOf(columns, turbines))[1]!

test('a healthy farm is checked by its moves and its neighbours, and nothing is blocked', () => {
  for (const check of signChecks(frameOf(farm))) {
    expect(check).toMatchObject({
      agrees: true,
      neighboursAgree: true,
      checked: true,
      stated: false,
      block: null,
      findings: [],
    })
    expect(check.moves).toBeGreaterThan(100)
    expect(check.text).toContain('a convention that all of them share would not show')
  }
})

test('a reversed vane blocks the turbine, is named as the culprit, and leaves the others alone', () => {
  const checks = signChecks(frameOf(withSecond(reversed('vane'))))
  expect(checks[1]).toMatchObject({ agrees: false, neighboursAgree: true, checked: false })
  expect(checks[1]!.block).toMatchObject({
    code: 'sign-disagrees',
    finding: { sensor: 'vane', severity: 'fault' },
  })
  expect(checks[1]!.text).toContain('set vane.sign to -1')
  expect([0, 2, 3].map((k) => checks[k]!.block)).toEqual([null, null, null])
})

test('a reversed nacelle position blocks the turbine and is named as the culprit', () => {
  const check = second(withSecond(reversed('nacelle_position')))
  expect(check).toMatchObject({ agrees: false, neighboursAgree: false })
  expect(check.block).toMatchObject({ code: 'sign-disagrees', finding: { sensor: 'nacelle-position' } })
  expect(check.text).toContain('set vane.sign to 1')
})

test('vane and nacelle reversed together agree with each other but not with the neighbours', () => {
  const check = second(withSecond(bothReversed))
  expect(check).toMatchObject({
    agrees: true,
    neighboursAgree: false,
    checked: false,
    block: { code: 'signs-reversed' },
  })
})

test('a sign in the site file counts as checked and lifts the block; what contradicts it is still said', () => {
  const columns = withSecond(reversed('vane'))
  const turned = second(columns, [{ turbine: farm[1]!.turbine, vane: { sign: -1 } }])
  expect(turned).toMatchObject({ stated: true, checked: true, agrees: true, block: null, findings: [] })
  const insisted = second(columns, [{ turbine: farm[1]!.turbine, vane: { sign: 1 } }])
  expect(insisted).toMatchObject({ stated: true, checked: true, agrees: false, block: null })
  expect(insisted.findings).toMatchObject([{ severity: 'warn', sensor: 'vane' }])
})

test('a nacelle scale wound or signed changes nothing', () => {
  const plain = second(farm)
  for (const scale of [
    (angle: number) => (angle > 180 ? angle - 360 : angle),
    (angle: number) => (angle > 200 ? angle + 360 : angle + 720),
  ]) {
    const check = second(
      withSecond((numbers) => ({ nacelle_position: numbers['nacelle_position']!.map(scale) })),
    )
    expect(check.moves).toBe(plain.moves)
    expect(check.moveCorrelation).toBeCloseTo(plain.moveCorrelation, 9)
  }
})

test('without a nacelle position, and with two turbines, it cannot be told, and the text says what is missing', () => {
  const missing = second(withSecond(({ vane }) => ({ nacelle_position: vane!.map(() => NaN) })))
  expect(missing).toMatchObject({
    moves: 0,
    agrees: null,
    neighboursAgree: null,
    checked: false,
    block: null,
  })
  expect(missing.text).toContain('no nacelle position')
  const pair = second(farm.slice(0, 2))
  expect(pair).toMatchObject({ agrees: true, neighboursAgree: null, checked: false, block: null })
  expect(pair.text).toContain('3 turbines')
})

test('a vane that has nothing to do with the nacelle is called neither right nor wrong', () => {
  const check = second(
    withSecond(({ vane }) => ({ vane: vane!.map((_, i) => vane![(i + 700) % vane!.length]!) })),
  )
  expect(check.agrees).toBeNull()
  expect(check.block).toBeNull()
})

test('rows of ten seconds are judged as rows of ten minutes are', () => {
  const fast = columnsOf(simulateFarm({ seed: 12, turbines: 1, days: 3, rateS: 10 }))
  expect(signChecks(frameOf(fast, [], 10))[0]!.agrees).toBe(true)
  const turned = fast.map((columns) => ({
    ...columns,
    numbers: { ...columns.numbers, ...reversed('vane')(columns.numbers) },
  }))
  expect(signChecks(frameOf(turned, [], 10))[0]!.agrees).toBe(false)
})

test.skipIf(!existsSync(SHARED))(
  'on a real two-day log no turbine is blocked and most are seen to follow their vane (skipped where ../shared is absent)',
  () => {
    const checks = signChecks(frameOf(realFarm()))
    expect(checks.length).toBe(134)
    expect(
      checks.filter(({ agrees, neighboursAgree }) => agrees === false || neighboursAgree === false),
    ).toEqual([])
    expect(checks.filter(({ agrees }) => agrees === true).length).toBeGreaterThan(67)
    const turned = realFarm().map((columns) => ({
      ...columns,
      numbers: { ...columns.numbers, ...reversed('vane')(columns.numbers) },
    }))
    expect(signChecks(frameOf(turned)).filter(({ agrees }) => agrees === true)).toEqual([])
  },
)

/** Columns of the log: turbine, day, clock, wind speed, vane, two temperatures, nacelle position, pitch x 3, reactive and active power. */
function realFarm(): TurbineColumns[] {
  const byTurbine = new Map<string, number[][]>()
  for (const line of readFileSync(SHARED, 'utf8').trim().split('\n').slice(1)) {
    const cells = line.split(',')
    const [hour, minute] = cells[2]!.split(':').map(Number)
    const numbers = cells.map((cell) => (cell === '' ? NaN : Number(cell)))
    const row = [
      Date.UTC(2020, 4, numbers[1], hour, minute),
      numbers[3]!,
      numbers[4]!,
      numbers[7]!,
      numbers[8]!,
      numbers[12]!,
    ]
    byTurbine.set(cells[0]!, [...(byTurbine.get(cells[0]!) ?? []), row])
  }
  return [...byTurbine].map(([turbine, rows]) => {
    const column = (k: number): Float64Array => Float64Array.from(rows, (row) => row[k]!)
    const [time, wind_speed, vane, nacelle_position, pitch, power] = [0, 1, 2, 3, 4, 5].map(column) as [
      Float64Array,
      Float64Array,
      Float64Array,
      Float64Array,
      Float64Array,
      Float64Array,
    ]
    return { turbine, time, numbers: { wind_speed, vane, nacelle_position, pitch, power }, texts: {} }
  })
}
