import { expect, test } from 'vitest'
import { newestProofs } from '../../../src/replay/trend/newest-proofs.ts'
import { trendOf } from '../../../src/replay/trend/trend.ts'
import { isNothingNew, whatIsNew } from '../../../src/replay/trend/what-is-new.ts'
import type { ScoreSheet } from '../../../src/sheet/index.ts'
import { sheetExample, turbineExample } from '../../http/sheet-example.ts'

function month(replay: string, number: number, standing: Record<string, number | null>): ScoreSheet {
  const sheet = sheetExample(
    replay,
    Object.entries(standing).map(([turbine, deg]) => turbineExample(turbine, deg)),
  )
  const iso = (m: number): string => new Date(Date.UTC(2026, m - 1, 1)).toISOString()
  return { ...sheet, window: { ...sheet.window, from: iso(number), to: iso(number + 1) } }
}

test('months stand in the order of their windows, and of a month scored twice the sheet made last counts', () => {
  const sheets = [
    month('again', 1, { Q01: 6 }),
    month('march', 3, { Q01: 6.2 }),
    month('february', 2, { Q01: 6.1 }),
    month('january', 1, { Q01: 1 }),
  ]
  const { turbines, fleet } = trendOf('quern-hill', sheets)
  expect(turbines[0]!.points.map(({ replay }) => replay)).toEqual(['again', 'february', 'march'])
  expect(fleet.points.map(({ replay }) => replay)).toEqual(['again', 'february', 'march'])
  expect(turbines[0]!.lines.find(({ quantity }) => quantity === 'standingDeg')).toMatchObject({
    windows: 3,
    beyondChance: false,
  })
})

test('news are a verdict that changed, a misalignment that moved beyond the combined error, and findings that came', () => {
  const before = month('a', 1, { Q01: 6.1, Q02: 6.1, Q03: 6.1, Q04: 6.1 })
  const now = month('b', 2, { Q01: 6.3, Q02: 9.5, Q03: null })
  now.turbines[0]!.sensors = [
    {
      sensor: 'vane',
      kind: 'frozen',
      finding: 'it stood still',
      severity: 'fault',
      howSure: 'likely',
      checkFirst: 'the heating',
      from: null,
      to: null,
      detail: {},
    },
  ]
  const news = whatIsNew(now, before)
  expect(news.verdicts.map(({ turbine, from, to }) => [turbine, from, to])).toEqual([
    ['Q03', 'offset', 'undetermined'],
  ])
  // Half-widths of the example: scatter 0.9 and response 0.8, so a change has sqrt(2 (0.81 + 0.64)) = 1.70.
  expect(news.moved.map(({ turbine }) => turbine)).toEqual(['Q02'])
  expect(news.moved[0]!.interval95Deg[0]).toBeCloseTo(3.4 - Math.sqrt(2.9), 9)
  expect(news.findings.map(({ turbine, kind }) => [turbine, kind])).toEqual([['Q01', 'frozen']])
  expect(news.missing).toEqual(['Q04'])
  expect(isNothingNew(whatIsNew(before, before))).toBe(true)
})

test('a correction keeps the outcome that a sheet could give over a later one that could not', () => {
  const proof = (outcome: string) =>
    ({ turbine: 'Q01', at: '2026-03-02T10:00:00.000Z', enteredDeg: 6, outcome }) as never
  const sheets = [
    { ...sheetExample('new'), corrections: [proof('too early')] },
    { ...sheetExample('old'), corrections: [proof('worked')] },
  ]
  expect(newestProofs(sheets).map(({ outcome }) => outcome)).toEqual(['worked'])
})
