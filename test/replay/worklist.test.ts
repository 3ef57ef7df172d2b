import { expect, test } from 'vitest'
import { outlooks } from '../../src/replay/outlook.ts'
import { worklistOf } from '../../src/replay/worklist.ts'
import type { SensorFinding, SiteFile, TurbineSheet, WorklistEntry } from '../../src/sheet/index.ts'
import { fleetOrder, workOrder } from '../../src/sheet/work-order.ts'
import { turbineExample } from '../http/sheet-example.ts'

/** A sheet with m, its half-width, and a loss of 2.5 MWh a year for each square degree. */
function sheetOf(
  turbine: string,
  standingDeg: number,
  half = 1.2,
  change: Partial<TurbineSheet> = {},
): TurbineSheet {
  const one = turbineExample(turbine, standingDeg)
  const interval = [standingDeg - half, standingDeg + half]
  const annual = (deg: number): number => 2.5 * deg * deg
  return {
    ...one,
    model: 'M1',
    verdict: Math.abs(standingDeg) - half > 1.5 && Math.abs(standingDeg) >= 3 ? 'offset' : 'aligned',
    staticOffset: {
      ...one.staticOffset,
      standingInterval95Deg: interval,
      intervalParts: { statistical: half, response: 0, exponent: 0, instrument: null, dilution: 0 },
      signChecked: true,
      vaneLogged: 'afterCorrection',
    },
    energyLoss: {
      ...one.energyLoss,
      static: {
        ...one.energyLoss.static,
        annualMwh: annual(standingDeg),
        annualInterval95Mwh: interval.map(annual),
        byMisalignment: [-9, -6, -3, 3, 6, 9].map((deg) => ({
          standingDeg: deg,
          windowMwh: annual(deg) / 12,
          annualMwh: annual(deg),
        })),
      },
    },
    ...change,
  }
}

function listOf(turbines: readonly TurbineSheet[], site: SiteFile = {}): WorklistEntry[] {
  const expected = outlooks(turbines, 3)
  return worklistOf(
    turbines.map((turbine, i) => ({ ...turbine, outlook: expected[i] ?? null })),
    site,
    3,
  )
}

const QUIET = ['A1', 'A2', 'A3', 'A4'].map((name, i) => sheetOf(name, 0.3 * i - 0.4))
const fault = (change: Partial<SensorFinding> = {}): SensorFinding => ({
  sensor: 'vane',
  kind: 'frozen',
  finding: 'the vane stood still for three days',
  severity: 'fault',
  howSure: 'certain',
  checkFirst: 'At the desk: look at the temperature.',
  from: null,
  to: null,
  detail: {},
  ...change,
})

test('the list is ranked by the energy of offsets that are drawn in; who stands right is not on it', () => {
  const list = listOf([...QUIET, sheetOf('B1', 5.2), sheetOf('B2', -7.5), sheetOf('B3', 4.4)])
  expect(list.map(({ turbine }) => turbine)).toEqual(['B2', 'B1', 'B3'])
  for (const entry of list) {
    expect(Math.abs(entry.shrunkStandingDeg!)).toBeLessThan(Math.abs(entry.standingMisalignmentDeg!))
    // 2.5 MWh for each square degree; 1 - cos^3 and a square part by 0.5 % within 9 degrees.
    expect(entry.expectedAnnualMwh! / (2.5 * entry.shrunkStandingDeg! ** 2)).toBeCloseTo(1, 2)
    expect(entry.interval95Mwh[0]).toBeLessThan(entry.expectedAnnualMwh!)
    expect(entry.interval95Mwh[1]).toBeGreaterThan(entry.expectedAnnualMwh!)
    expect(entry.probabilityBeyondThreshold).toBeGreaterThan(0.8)
  }
})

test('a change is told both ways and in steps, with the parameter as it is and as it will be', () => {
  const site: SiteFile = { turbines: [{ turbine: 'B1', vane: { correctionDeg: -1.5, sign: 1 } }] }
  const [plus] = listOf([...QUIET, sheetOf('B1', 6.1)], site)
  expect(plus!.addToVaneDeg).toBe(6.1)
  expect(plus!.whatToDo).toMatch(
    /enter \+6\.1 degrees more vane offset .*6\.1 degrees further clockwise.*zero mark of the vane 6\.1 degrees counter-clockwise, seen from above/,
  )
  expect(plus!.firstStepDeg).toBeCloseTo(3.1, 9) // half, to a tenth
  expect(plus!.parameter!.newDeg).toBeCloseTo(4.6, 9)
  expect(plus!.parameter!.afterFirstStepDeg).toBeCloseTo(1.6, 9)
  const [minus] = listOf([...QUIET, sheetOf('B1', -12.4)])
  expect(minus!.whatToDo).toMatch(/enter -12\.4 .*further counter-clockwise.*12\.4 degrees clockwise/)
  expect(minus!.firstStepDeg).toBe(-5)
  expect(minus!.checkFirst).toContain('damaged, loose or wrongly mounted')
  expect(minus!.parameter).toBeNull()
})

test('no number to enter while sign or kind of vane is not known', () => {
  for (const open of [{ signChecked: false }, { vaneLogged: 'unknown' as const }]) {
    const sheet = sheetOf('B1', 6.1)
    const [entry] = listOf([...QUIET, { ...sheet, staticOffset: { ...sheet.staticOffset, ...open } }])
    expect(entry).toMatchObject({ turbine: 'B1', addToVaneDeg: null, firstStepDeg: null, parameter: null })
    expect(entry!.whatToDo).toContain('no number to enter yet')
  }
})

test('turbines that are off alike are one entry that asks for a measurement, and one of their own stays', () => {
  const alike = [6.2, 5.8, 6.4, 6.0, 5.6].map((deg, i) => sheetOf(`C${i + 1}`, deg, 1))
  const list = listOf([...alike, sheetOf('C6', -5, 1)])
  expect(list.filter(({ kind }) => kind === 'shared')).toEqual([])
  const [shared, ...rest] = listOf([...alike, sheetOf('C6', 6.3, 1)])
  expect(rest).toEqual([])
  expect(shared).toMatchObject({
    kind: 'shared',
    addToVaneDeg: null,
    turbines: ['C1', 'C2', 'C3', 'C4', 'C5', 'C6'],
  })
  expect(shared!.whatToDo).toMatch(/Measure one or two.*constant of the controller.*flow.*anemometers/)
  expect(shared!.standingMisalignmentDeg).toBeCloseTo(6.05, 1)
  expect(shared!.interval95Mwh[0]).toBe(0)
  // A response that nobody knows is shared by all, and no number of turbines makes it surer.
  const unknown = alike.map((sheet) => ({
    ...sheet,
    staticOffset: {
      ...sheet.staticOffset,
      intervalParts: { ...sheet.staticOffset.intervalParts, response: 9 },
    },
  }))
  expect(listOf(unknown).filter(({ kind }) => kind === 'shared')).toEqual([])
})

test('one visit holds all findings; a faulty sensor alone is a visit without a number', () => {
  const both = { ...sheetOf('B1', 6.1), sensors: [fault({ severity: 'warn' })] }
  const sensor = { ...sheetOf('A9', 0.2), sensors: [fault()] }
  const doubtful = { ...sheetOf('A8', 0.1), sensors: [fault({ howSure: 'possible' })] }
  const clock = { ...sheetOf('A7', 0.1), sensors: [fault({ sensor: 'clock', kind: 'clock-off' })] }
  const list = listOf([...QUIET, both, sensor, doubtful, clock])
  expect(list.map(({ turbine, kind }) => [turbine, kind])).toEqual([
    ['B1', 'offset'],
    ['A9', 'sensor'],
  ])
  expect(list[0]!.findings.length).toBe(1)
  expect(list[0]!.deskChecks).toContain('At the desk: look at the temperature.')
  expect(list[1]).toMatchObject({ addToVaneDeg: null, expectedAnnualMwh: null, value: null })
})

const priced = (sheet: TurbineSheet, pricePerMwh: number): TurbineSheet => ({
  ...sheet,
  energyLoss: {
    ...sheet.energyLoss,
    value: {
      currency: 'EUR',
      windowPricePerMwh: pricePerMwh,
      annualPricePerMwh: pricePerMwh,
      window: 1,
      annual: 1,
      annualInterval95: [0, 2],
      note: '',
    },
  },
})

test('with a price the visit is reckoned net of its cost, and without one there is no money', () => {
  const site: SiteFile = { value: { currency: 'EUR', pricePerMwh: 60, visitCost: 900 } }
  const [entry] = listOf([...QUIET, priced(sheetOf('B1', 6.1), 60)], site)
  const value = entry!.value!
  expect(value.annual).toBeCloseTo(60 * entry!.expectedAnnualMwh!, 9)
  expect(value.firstYearNet).toBeCloseTo(value.annual! - 900, 9)
  expect(value.paybackMonths).toBeCloseTo((12 * 900) / value.annual!, 9)
  expect(value.paybackInterval95Months[0]).toBeLessThan(value.paybackMonths!)
  expect(value.paybackInterval95Months[1]).toBeGreaterThan(value.paybackMonths!)
  const [none] = listOf([...QUIET, sheetOf('B1', 6.1)], site)
  expect(none!.value).toBeNull()
  expect(textOf([none!])).not.toMatch(/EUR|worth|paid/)
  // A visit that does not pay is said to be none.
  const dear: SiteFile = { value: { currency: 'EUR', pricePerMwh: 60, visitCost: 90_000 } }
  expect(textOf(listOf([...QUIET, priced(sheetOf('B1', 6.1), 60)], dear))).toContain('does not pay a visit')
})

const WINDOW = { from: '2026-03-01T00:00:00.000Z', to: '2026-04-01T00:00:00.000Z', intervalS: 600 }
const orderOf = (site: string, worklist: readonly WorklistEntry[]) => ({
  replay: 'r',
  site,
  window: WINDOW,
  worklist,
  unsettled: [],
})
const textOf = (worklist: readonly WorklistEntry[]): string =>
  workOrder(orderOf('quern-hill', worklist)).replaceAll(/\s+/g, ' ')

test('a work order tells somebody who was not there where to go, what to turn, what to check and to watch', () => {
  const site: SiteFile = { turbines: [{ turbine: 'B1', vane: { correctionDeg: 0.5, sign: 1 } }] }
  const list = listOf([...QUIET, sheetOf('B1', 6.1)], site)
  const text = textOf(list)
  for (const part of [
    'where: quern-hill, turbine B1',
    'misalignment m: +6.1 degrees (95 %: +4.9 to +7.3)',
    'now +0.5 degrees by the site file',
    'before a climb, at the desk:',
    'afterwards:',
    'what would make it surer:',
    'vane offset as found: ______',
    'as left: ______',
    ...list[0]!.cautions,
  ]) {
    expect(text).toContain(part)
  }
  for (const word of [
    'independent measurement',
    'trial step',
    'half',
    '5 degrees',
    'yaw activity, loads and alarms',
    'as found',
    '10 degrees',
    'certifier',
    'authorised',
    'rotor locked',
    'locked out',
    'cable twist',
    'weather limits',
    'rescue plan',
    'permit',
    'warranty',
    'grid operator',
    'remote',
    'Local rules come first',
  ]) {
    expect(list[0]!.cautions.join(' '), word).toContain(word)
  }
  expect(
    Math.max(
      ...workOrder(orderOf('quern-hill', list))
        .split('\n')
        .map((line) => line.length),
    ),
  ).toBeLessThanOrEqual(100)
})

test('over sites the costliest visit comes first, sensors last, and sites without a list are named', () => {
  const first = listOf([...QUIET, sheetOf('B1', 5), { ...sheetOf('A9', 0.2), sensors: [fault()] }])
  const second = listOf([...QUIET, sheetOf('D1', 8)])
  const text = fleetOrder(
    [orderOf('east', first), orderOf('west', second)],
    [{ site: 'north', reason: 'no finished replay' }],
  )
  expect(text.indexOf('west, D1')).toBeLessThan(text.indexOf('east, B1'))
  expect(text.indexOf('east, B1')).toBeLessThan(text.indexOf('east, A9'))
  expect(text).toContain('- north: no finished replay')
  expect(text).toContain('Worklist of east')
  expect(text).toContain('Worklist of west')
})
