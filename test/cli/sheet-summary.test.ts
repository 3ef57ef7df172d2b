import { expect, test } from 'vitest'
import { csvTables } from '../../src/cli/csv-tables.ts'
import { progressLine } from '../../src/cli/progress-line.ts'
import { sheetSummary } from '../../src/cli/sheet-summary.ts'
import { sheetExample, turbineExample } from '../http/sheet-example.ts'

test('a misalignment that is not settled shows its estimate within its interval, and its loss as an interval alone', () => {
  const open = turbineExample('Q02', 4.4)
  open.verdict = 'undetermined'
  open.staticOffset.standingInterval95Deg = [-3.04, 11.8]
  const line = sheetSummary(sheetExample('r', [open]), [])
    .split('\n')
    .find((one) => one.startsWith('Q02'))
  expect(line).toMatch(/^Q02 +undetermined +\+4\.4 \[-3\.0, \+11\.8\] +\? +\[40, 121\] /)
})

test('what is not known at all is a question mark, and a rounded zero has no sign', () => {
  const blocked = turbineExample('Q03', null)
  const still = turbineExample('Q04', -0.04)
  still.verdict = 'aligned'
  still.staticOffset.standingInterval95Deg = [-1.2, 1.1]
  const lines = sheetSummary(sheetExample('r', [blocked, still]), []).split('\n')
  expect(lines.find((one) => one.startsWith('Q03'))).toMatch(/^Q03 +undetermined +\? +\?/)
  expect(lines.find((one) => one.startsWith('Q04'))).toContain(' 0.0 [-1.2, +1.1]')
})

test('long names, reasons and warnings stay within 120 columns, and cautions are said once', () => {
  const long = turbineExample('a turbine with quite a long name', 5)
  long.advice = ['word '.repeat(60)]
  long.cautions = ['the same caution for both '.repeat(8)]
  const other = turbineExample('Q09', 5)
  other.cautions = long.cautions
  const sheet = sheetExample('r', [long, other])
  sheet.warnings = ['warned '.repeat(50)]
  const text = sheetSummary(sheet, ['out/score-sheet.json'])
  expect(Math.max(...text.split('\n').map((line) => line.length))).toBeLessThanOrEqual(120)
  expect(text.match(/the same caution for both/g)?.length).toBeLessThanOrEqual(5)
  expect(text).toContain('- all: the same caution')
  expect(text).toContain('a turbine')
})

test('what is wrong with a sensor is told in full, what is only information is not', () => {
  const one = turbineExample('Q01', 0.2)
  const frozen = {
    sensor: 'vane',
    kind: 'frozen',
    finding: `the vane stood still ${'and still '.repeat(20)}for 14 hours`,
    severity: 'warn',
    howSure: 'certain',
    checkFirst: '',
    from: null,
    to: null,
    detail: {},
  } as const
  one.sensors = [frozen, { ...frozen, kind: 'north-offset', severity: 'info', finding: 'another north' }]
  const text = sheetSummary(sheetExample('r', [one]), [])
  expect(text).toContain('Sensors, drives, controllers:\n- Q01 (warn): the vane stood still')
  expect(text).toContain('for 14 hours')
  expect(text).not.toContain('another north')
  expect(Math.max(...text.split('\n').map((line) => line.length))).toBeLessThanOrEqual(120)
  expect(sheetSummary(sheetExample('r', [turbineExample('Q01', 0.2)]), [])).not.toContain('Sensors, drives')
})

test('csv quotes what would break a row, and leaves the unknown empty', () => {
  const one = turbineExample('Q"1, north', null)
  one.reason = 'two\nlines'
  const { 'turbines.csv': csv } = csvTables(sheetExample('r', [one]))
  expect(csv).toContain('"Q""1, north"')
  expect(csv).toContain('"two\nlines",,,,')
  expect(csv).not.toContain('null')
  expect(csv).not.toContain('NaN')
  expect(csvTables({ ...sheetExample('r'), worklist: [] })['worklist.csv']).toBe('rank,turbine\n')
})

test('progress is one line that is cleared, and only where somebody watches', () => {
  const written: string[] = []
  const terminal = (isTTY: boolean) => ({ isTTY, write: (text: string) => written.push(text) }) as never
  const quiet = progressLine(terminal(false))
  quiet.show({ stage: 'reading', share: 0.5 })
  quiet.clear()
  expect(written).toEqual([])
  const shown = progressLine(terminal(true))
  shown.show({ stage: 'scoring', share: 0.25 })
  shown.show({ stage: 'scoring', share: 0.251 })
  shown.clear()
  expect(written).toEqual(['\r\u001b[2Kscoring 25 %', '\r\u001b[2K'])
})
