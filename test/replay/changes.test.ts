import { expect, test } from 'vitest'
import type { TurbineColumns } from '../../src/frame/index.ts'
import { openScorers } from '../../src/replay/index.ts'
import { scoreFarm } from '../../src/replay/score-farm.ts'
import type { Receipt } from '../../src/sheet/index.ts'
import { simulateFarm } from '../../src/simulate/index.ts'
import { SETTINGS } from '../frame/settings.ts'

const DAY_S = 86_400
const KNOCK_DAY = 14
const farm = simulateFarm({
  seed: 90_125,
  turbines: 4,
  days: 30,
  offsetsDeg: [0.5, 0, -0.5, 1],
  offsetChanges: [{ turbine: 1, atS: KNOCK_DAY * DAY_S, toDeg: 7, entered: false }],
})
const columns: TurbineColumns[] = farm.turbines.map((turbine) => ({
  turbine: turbine.turbine,
  time: turbine.timeMs,
  numbers: turbine.columns,
  texts: { status: turbine.status },
}))
const rows = columns.reduce((sum, { time }) => sum + time.length, 0)
const receipt: Receipt = {
  received: rows,
  accepted: rows,
  duplicate: 0,
  rejected: 0,
  rejectedByReason: [],
  blankLines: 0,
  first: null,
  last: null,
  intervalS: 600,
  turbines: [],
  columns: [],
  inputs: [],
  warnings: [],
}

test('a vane that was knocked has two offsets: the sheet gives the last one, when it came, and what it was before', async () => {
  const sheet = await scoreFarm(
    columns,
    {
      replay: 'r',
      version: '0',
      settings: { ...SETTINGS, resamples: 300, assumedResponsePctPerDeg: 0 },
      receipt,
      reading: {},
      site: {
        runningStatus: ['run', 'limited'],
        turbines: columns.map(({ turbine }) => ({ turbine, ratedPowerKw: farm.scenario.ratedPowerKw })),
      },
    },
    openScorers(0),
  )
  const knocked = sheet.turbines[1]!
  const [change] = knocked.staticOffset.changes
  const atMs = farm.scenario.startMs + KNOCK_DAY * DAY_S * 1000
  expect(knocked.staticOffset.changes.length).toBe(1)
  expect(Math.abs(Date.parse(change!.at) - atMs)).toBeLessThan(12 * 3_600_000)
  expect(Math.abs(change!.sizeDeg! - 7)).toBeLessThan(1.5)
  const [low, high] = knocked.staticOffset.interval95Deg as [number, number]
  expect(low).toBeLessThan(7)
  expect(high).toBeGreaterThan(7)
  expect(knocked.verdict).toBe('offset')
  const before = knocked.rows.setAside.find(({ reason }) => reason === 'before-change')!
  expect(before.rows).toBeGreaterThan(300)
  for (const { turbine, rows: counts, staticOffset } of sheet.turbines) {
    const aside = counts.setAside.reduce((sum, one) => sum + one.rows, 0)
    expect(counts.used + aside, turbine).toBe(counts.accepted)
    if (turbine !== knocked.turbine) expect(staticOffset.changes, turbine).toEqual([])
  }
})
