import { readFileSync } from 'node:fs'
import { Value } from 'typebox/value'
import { afterAll, beforeAll, expect, test } from 'vitest'
import { ScoreSheet } from '../../src/sheet/index.ts'
import {
  DEMO_LOG,
  DEMO_SITE,
  DEMO_TRUTH,
  demoRequest,
  demoText,
  makeFolder,
  openService,
  removeFolder,
  sha256,
  turbineOf,
  writeLog,
  type Service,
} from './farm.ts'

let folder: string
let service: Service
/** With the response known to be 0 and the exponent to be 3, as the made-up month's README says they are. */
let sheet: ScoreSheet
/** With neither known, as on a real farm. */
let unsure: ScoreSheet

beforeAll(async () => {
  folder = await makeFolder()
  service = await openService(folder)
  sheet = await service.replays.oneShot(demoRequest({ assumedResponsePctPerDeg: 0, exponentLow: 3 }))
  unsure = await service.replays.oneShot(demoRequest())
})
afterAll(async () => {
  await service.close()
  await removeFolder(folder)
})

test('exponents whose range is crossed are refused before anything is read', async () => {
  await expect(
    service.replays.oneShot(demoRequest({ exponentLow: 3, exponentHigh: 2 })),
  ).rejects.toMatchObject({
    code: 'BAD_OPTION',
    message: 'exponentLow: expected at most exponentHigh (2), got 3',
  })
})

test('the three turbines that stand off the wind are found, the others are aligned', () => {
  expect(sheet.turbines.map(({ turbine, verdict }) => `${turbine} ${verdict}`)).toEqual([
    'Q01 aligned',
    'Q02 aligned',
    'Q03 aligned',
    'Q04 offset',
    'Q05 aligned',
    'Q06 offset',
    'Q07 aligned',
    'Q08 offset',
  ])
})

test('an exponent that is not known moves the far ends of intervals, and costs no turbine that stands off', async () => {
  const open = await service.replays.oneShot(demoRequest({ assumedResponsePctPerDeg: 0 }))
  for (const { turbine, verdict, reasonCode, staticOffset, energyLoss } of open.turbines) {
    const known = turbineOf(sheet, turbine)
    const [low, high] = staticOffset.standingInterval95Deg as [number, number]
    const given = known.staticOffset.standingInterval95Deg as [number, number]
    expect(staticOffset.standingInterval95GivenExponentDeg, turbine).toEqual(given)
    expect(staticOffset.intervalParts.exponent, turbine).toBeCloseTo(
      Math.max(given[0] - low, high - given[1]),
      9,
    )
    expect(known.staticOffset.intervalParts.exponent, turbine).toBe(0)
    if (known.verdict === 'offset') {
      expect(verdict, turbine).toBe('offset')
      expect(Math.min(Math.abs(low), Math.abs(high)), turbine).toBe(Math.min(...given.map(Math.abs)))
      // What is seen is p d: a lower exponent means a larger loss.
      expect(energyLoss.static.annualInterval95Mwh[1]!, turbine).toBeGreaterThan(
        known.energyLoss.static.annualInterval95Mwh[1]!,
      )
    } else if (verdict !== 'aligned') expect(reasonCode, turbine).toBe('exponent-not-known')
  }
})

test('the intervals of the turbines that stand off hold the truth, and the estimates are near it', () => {
  for (const name of ['Q04', 'Q06', 'Q08']) {
    const truth = DEMO_TRUTH.turbines.find(({ turbine }) => turbine === name)!
    const { interval95Deg, standingInterval95Deg, estimateDeg, standingMisalignmentDeg } = turbineOf(
      sheet,
      name,
    ).staticOffset
    expect(interval95Deg[0], name).toBeLessThan(truth.offsetDeg)
    expect(interval95Deg[1], name).toBeGreaterThan(truth.offsetDeg)
    expect(standingInterval95Deg[0], name).toBeLessThan(truth.yawErrorMeanDeg)
    expect(standingInterval95Deg[1], name).toBeGreaterThan(truth.yawErrorMeanDeg)
    // A month of one turbine tells 1 to 1.5 degrees at 95 %.
    expect(Math.abs(estimateDeg! - truth.offsetDeg), name).toBeLessThan(1.5)
    expect(Math.abs(standingMisalignmentDeg! - truth.yawErrorMeanDeg), name).toBeLessThan(1.5)
  }
})

test('the energy account is that of the simulation', () => {
  for (const truth of DEMO_TRUTH.turbines) {
    const { producedMwh, static: loss } = turbineOf(sheet, truth.turbine).energyLoss
    // Rows that by status do not run, or lost a cell, are not counted: up to 0.9 % of this month; nor those in which the
    // vane of Q03 stood still, in strong wind: 3 % more.
    expect(producedMwh! / truth.producedMwh - 1, truth.turbine).toBeLessThan(0.001)
    expect(producedMwh! / truth.producedMwh - 1, truth.turbine).toBeGreaterThan(
      truth.turbine === 'Q03' ? -0.04 : -0.01,
    )
    if (turbineOf(sheet, truth.turbine).verdict !== 'offset') continue
    expect(loss.windowInterval95Mwh[0], truth.turbine).toBeLessThan(truth.lostStaticMwh)
    expect(loss.windowInterval95Mwh[1], truth.turbine).toBeGreaterThan(truth.lostStaticMwh)
  }
})

test('the five faults of the month are named with their kind and time, and no sensor besides', () => {
  const HOUR_MS = 3_600_000
  const expected = {
    'vane-iced': ['vane', 'icing'],
    'nacelle-shift': ['nacelle-position', 'position-step'],
    'anemometer-gain': ['anemometer', 'gain-drift'],
    'vane-noise': ['vane', 'noise-changed'],
    'nacelle-zero-lost': ['nacelle-position', 'zero-lost'],
  }
  expect(DEMO_TRUTH.faults.map(({ kind }) => kind).sort()).toEqual(Object.keys(expected).sort())
  for (const { turbine, kind, from } of DEMO_TRUTH.faults) {
    const { sensors, attribution } = turbineOf(sheet, turbine)
    const told = sensors.filter(({ severity }) => severity !== 'info')
    expect(
      told.map((one) => [one.sensor, one.kind]),
      turbine,
    ).toEqual([expected[kind as keyof typeof expected]])
    // Gain is told in spells of six hours, the others by rows.
    const { at, steps } = told[0]!.detail as { at?: string; steps?: { at: string }[] }
    const since = at ?? steps?.[0]?.at ?? told[0]!.from!
    expect(Math.abs(Date.parse(since) - Date.parse(from)), kind).toBeLessThanOrEqual(12 * HOUR_MS)
    expect(attribution.evidence.length, turbine).toBeGreaterThan(0)
    expect(attribution.wouldSettle[0], turbine).toMatch(/^At the desk/)
  }
  const faulty = new Set(DEMO_TRUTH.faults.map(({ turbine }) => turbine))
  for (const { turbine, sensors } of sheet.turbines) {
    if (!faulty.has(turbine))
      expect(
        sensors.filter(({ severity }) => severity !== 'info'),
        turbine,
      ).toEqual([])
  }
})

test('every posted row is in the account, and every accepted row has one reason or is used', () => {
  const { log } = DEMO_TRUTH
  expect(sheet.rows.received).toBe(log.dataLines)
  expect(sheet.rows.received).toBe(sheet.rows.accepted + sheet.rows.duplicate + sheet.rows.rejected)
  expect(sheet.rows.duplicate).toBe(log.repeated)
  expect(sheet.rows.rejected).toBe(log.cut + log.unreadable)
  const accepted = sheet.turbines.reduce((sum, { rows }) => sum + rows.accepted, 0)
  expect(accepted).toBe(sheet.rows.accepted)
  for (const { turbine, rows, staticOffset } of sheet.turbines) {
    const aside = rows.setAside.reduce((sum, one) => sum + one.rows, 0)
    expect(rows.used + aside, turbine).toBe(rows.accepted)
    expect(staticOffset.rows, turbine).toBe(rows.used)
  }
})

test('the hours in which one turbine was held at 900 kW are set aside by status, by set-point, or by the site file', async () => {
  // 12 March, 09:00 to 15:30: 39 rows with the status `limited`, which the site file does not count as running.
  const exclude = [{ turbine: 'Q02', from: '2026-03-12T09:00:00Z', to: '2026-03-12T15:30:00Z' }]
  const scored = (change: object) =>
    service.replays.oneShot(
      demoRequest({ assumedResponsePctPerDeg: 0 }, { site: { ...DEMO_SITE, ...change } }),
    )
  const [left, bySetPoint] = [await scored({ exclude }), await scored({ runningStatus: ['run', 'limited'] })]
  const rows = (one: ScoreSheet, turbine: string, name: string): number =>
    turbineOf(one, turbine).rows.setAside.find(({ reason }) => reason === name)?.rows ?? 0
  expect(rows(left, 'Q02', 'excluded')).toBe(39)
  expect(rows(sheet, 'Q02', 'not-running') - rows(left, 'Q02', 'not-running')).toBe(39)
  expect(rows(sheet, 'Q02', 'not-running') - rows(bySetPoint, 'Q02', 'not-running')).toBe(39)
  // Rows in which the nacelle turned are told as transitions first.
  const limited = rows(bySetPoint, 'Q02', 'limited') - rows(sheet, 'Q02', 'limited')
  expect(limited).toBeGreaterThan(20)
  expect(limited).toBeLessThanOrEqual(39)
  for (const { turbine } of sheet.turbines) {
    if (turbine !== 'Q02')
      expect(turbineOf(left, turbine).rows, turbine).toEqual(turbineOf(sheet, turbine).rows)
  }
})

test('the worklist names who stands off, the costliest first, and the number to enter', () => {
  expect(sheet.worklist.map(({ turbine }) => turbine)).toEqual(['Q06', 'Q04', 'Q08'])
  for (const entry of sheet.worklist) {
    const { standingMisalignmentDeg } = turbineOf(sheet, entry.turbine).staticOffset
    expect(entry.addToVaneDeg).toBe(standingMisalignmentDeg)
    expect(entry.cautions.length).toBeGreaterThan(0)
  }
})

test('the advice turns the nacelle the right way: a negative misalignment counter-clockwise', () => {
  expect(turbineOf(sheet, 'Q06').advice.join(' ')).toMatch(
    /further counter-clockwise.*zero mark of the vane [\d.]+ degrees clockwise/s,
  )
  expect(turbineOf(sheet, 'Q04').advice.join(' ')).toMatch(
    /further clockwise.*zero mark of the vane [\d.]+ degrees counter-clockwise/s,
  )
  expect(turbineOf(sheet, 'Q01').advice).toEqual(['Nothing to change.'])
})

test('scores fall with the misalignment', () => {
  const scores = Object.fromEntries(sheet.turbines.map(({ turbine, score }) => [turbine, score!]))
  expect(scores['Q06']).toBeLessThan(scores['Q04']!)
  expect(scores['Q04']).toBeLessThan(scores['Q08']!)
  for (const aligned of ['Q01', 'Q02', 'Q03', 'Q05', 'Q07'])
    expect(scores['Q08'], aligned).toBeLessThan(scores[aligned]!)
})

test('where the response is not known neighbours tell it, and every interval is wider and holds the truth', () => {
  const response = unsure.fleet.anemometerResponsePerDeg['M1']!
  expect(response.turbines).toBe(8)
  expect(response.interval95[0]).toBeLessThan(0) // the made-up anemometers are honest
  expect(response.interval95[1]).toBeGreaterThan(0)
  expect(response.interval95[1]! - response.interval95[0]!).toBeLessThan(2 * 1.96 * 0.0015) // less than the setting leaves open
  expect(response.changeWithSpeed.beyondChance).toBe(false)
  expect(response.square.beyondChance).toBe(false)
  expect(response.square.interval95[1]).toBeGreaterThan(response.square.interval95[0]!)
  for (const { turbine, verdict, staticOffset } of unsure.turbines) {
    const [low, high] = staticOffset.interval95Deg as [number, number]
    const known = turbineOf(sheet, turbine).staticOffset.interval95Deg as [number, number]
    const truth = DEMO_TRUTH.turbines.find((one) => one.turbine === turbine)!
    expect(high - low, turbine).toBeGreaterThan(known[1] - known[0])
    expect(low, turbine).toBeLessThan(truth.offsetDeg)
    expect(high, turbine).toBeGreaterThan(truth.offsetDeg)
    expect(staticOffset.estimates.length, turbine).toBe(3)
    if (Math.abs(truth.offsetDeg) <= 2) expect(verdict, turbine).not.toBe('offset')
  }
  expect(turbineOf(unsure, 'Q06').verdict).toBe('offset')
})

test('a lone turbine whose response is not known is undetermined, and the sheet says what would settle it', async () => {
  const q04 = demoText()
    .split('\n')
    .filter((line, i) => i === 0 || line.includes(',Q04,'))
    .join('\n')
  const lone = await service.replays.oneShot(
    demoRequest({}, { logs: [await writeLog(folder, 'q04.csv', q04)] }),
  )
  const { verdict, score, staticOffset } = turbineOf(lone, 'Q04')
  const [low, high] = staticOffset.standingInterval95Deg as [number, number]
  expect(high - low).toBeGreaterThan(2 * 9) // 9 to 13 degrees either way
  expect(high - low).toBeLessThan(2 * 13)
  expect(verdict).toBe('undetermined')
  expect(lone.turbines[0]!.reasonCode).toBe('response-not-known')
  expect(score).toBeNull()
  expect(staticOffset.furtherNote).toMatch(/reference.*neighbours.*1 Hz/)
  expect(lone.worklist).toEqual([])
  const response = lone.fleet.anemometerResponsePerDeg['M1']!
  expect(response.estimate).toBeNull()
  // 1.96 x 0.15 % per degree, the setting.
  expect(response.interval95[1]).toBeCloseTo(1.96 * 0.0015, 5)
  expect(sheet.fleet.anemometerResponsePerDeg['M1']).toMatchObject({
    estimate: 0,
    interval95: [0, 0],
    square: { size: null, interval95: [null, null], beyondChance: null },
  })
})

test('the sheet fits its schema once it has been through JSON', () => {
  for (const one of [sheet, unsure]) {
    const read: unknown = JSON.parse(JSON.stringify(one))
    expect([...Value.Errors(ScoreSheet, read)]).toEqual([])
    expect(Value.Check(ScoreSheet, read)).toBe(true)
  }
})

test('the kept sheet is the answer, byte for byte', async () => {
  const record = await service.replays.get(sheet.replay)
  expect(record.sheet).toBe(JSON.stringify(sheet))
  expect(record).toMatchObject({ state: 'done', site: 'quern-hill', problem: null })
  expect(record.finishedMs).toBeGreaterThan(record.createdMs)
})

test('the provenance holds what it takes to make the sheet again', () => {
  expect(sheet.provenance).toMatchObject({
    version: '0.0.0-test',
    seed: 1,
    settings: { exponent: 3, assumedResponsePctPerDeg: 0, seed: 1 },
    inputs: [
      {
        name: 'quern-hill-2026-03.csv.gz',
        sha256: sha256(readFileSync(DEMO_LOG)),
        rows: DEMO_TRUTH.log.dataLines,
      },
    ],
  })
  expect(sheet.window).toEqual({
    from: '2026-03-01T00:00:00.000Z',
    to: '2026-04-01T00:00:00.000Z',
    intervalS: 600,
  })
})
