import { expect, test } from 'vitest'
import { dayBlocks, headingSteps, proveCorrections } from '../../../src/analysis/index.ts'
import { SETTINGS } from '../../frame/settings.ts'
import { DAY_MS, FIRST_MS, madeFarm, stepAt, type Made } from '../changes/offset-changes-farm.ts'

const DAY = 20
const settings = { ...SETTINGS, resamples: 100, assumedResponsePctPerDeg: 0 }

/** T1 stands `before` off and `after` from day 20 on; five others in the same wind stand still. */
function proofOf(
  before: number,
  after: number,
  { enteredDeg = 6, days = 40, position = true, seed = 3 } = {},
) {
  const rest: Made[] = [1, -1, 0, 2, 0.5].map((deg) => ({ offsetDeg: () => deg, position }))
  const frame = madeFarm(days, [{ offsetDeg: stepAt(DAY, before, after), position }, ...rest], seed)
  const [proof] = proveCorrections({
    farm: frame,
    days: frame.calendar.days,
    dayWeights: dayBlocks(frame.calendar.days, settings),
    settings,
    corrections: [{ turbine: 'T1', at: new Date(FIRST_MS + DAY * DAY_MS).toISOString(), enteredDeg }],
    events: [],
    headings: headingSteps(frame),
    responses: frame.turbines.map(() => null),
    blocked: frame.turbines.map(() => false),
  })
  return proof!
}

test('+6 entered at a rotor 6 off takes d to 0: the nacelle turns clockwise by 6, power rises by what cos^3 says: worked', () => {
  const proof = proofOf(6, 0, { seed: 1, days: 60 })
  expect(proof.outcome).toBe('worked')
  expect(proof.urgent).toBe(false)
  // d falls by 6, so that N + v, which is direction + n - d, rises by 6.
  expect(Math.abs(proof.heading.stepDeg! - 6)).toBeLessThan(0.5)
  const [low, high] = proof.interval95Pct as [number, number]
  // Where the curve is a cube, turning from 6 to 0 gains 1 / cos(6 degrees)^3 - 1 = 1.66 %.
  expect(low).toBeLessThan(1.66)
  expect(high).toBeGreaterThan(1.66)
  expect(Math.abs(proof.predictedPct! - 1.66)).toBeLessThan(0.8)
  expect(proof.power.neighbours).toEqual(['T2', 'T3', 'T4', 'T5', 'T6'])
  expect(proof.placebos.list.length).toBeGreaterThan(5)
})

test('with the wrong sign the heading steps by -6: wrong way two days later, urgent, and its advice is to undo it', () => {
  const proof = proofOf(6, 12, { days: DAY + 2 })
  expect(proof).toMatchObject({ outcome: 'wrong way', urgent: true })
  expect(Math.abs(proof.heading.stepDeg! + 6)).toBeLessThan(1.5)
  expect(proof.advice).toMatch(/^Undo it/)
})

test('without nacelle position the wrong way shows in power within ten days', () => {
  const proof = proofOf(6, 12, { days: DAY + 10, position: false })
  expect(proof.heading.seenIn).toBeNull()
  expect(proof.outcome).toBe('wrong way')
})

test('what was never entered has not taken hold; half of it is partly', () => {
  expect(proofOf(6, 6).outcome).toBe('not taken hold')
  expect(proofOf(6, 3).outcome).toBe('partly')
})

test('a turbine that was corrected in the same days is no neighbour, and other turbines’ corrections are passed over', () => {
  const frame = madeFarm(30, [{}, {}, {}, {}], 5)
  const at = (day: number): string => new Date(FIRST_MS + day * DAY_MS).toISOString()
  const proofs = proveCorrections({
    farm: frame,
    days: frame.calendar.days,
    dayWeights: dayBlocks(frame.calendar.days, settings),
    settings,
    corrections: [
      { turbine: 'T2', at: at(16), enteredDeg: -4 },
      { turbine: 'T1', at: at(15), enteredDeg: 4, note: 'a trial' },
      { turbine: 'T1', at: at(400), enteredDeg: 4 },
      { turbine: 'none', at: at(15), enteredDeg: 4 },
    ],
    events: [],
    headings: headingSteps(frame),
    responses: frame.turbines.map(() => null),
    blocked: frame.turbines.map(() => false),
  })
  expect(proofs.map(({ turbine, note }) => [turbine, note])).toEqual([
    ['T1', 'a trial'],
    ['T2', null],
  ])
  expect(proofs[0]!.power.neighbours).toEqual(['T3', 'T4'])
})
