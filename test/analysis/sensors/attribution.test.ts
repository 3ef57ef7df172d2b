import { expect, test } from 'vitest'
import { attributions } from '../../../src/analysis/index.ts'
import type { Attribution, SensorFinding, TurbineSheet } from '../../../src/sheet/index.ts'
import { turbineExample } from '../../http/sheet-example.ts'

type Change = TurbineSheet['staticOffset']['changes'][number]

/** A turbine that stands to the wind and shows nothing, but for what is given. */
function sheetOf(
  given: {
    turbine?: string
    verdict?: TurbineSheet['verdict']
    standingDeg?: number | null
    sensors?: SensorFinding[]
    changes?: Change[]
  } = {},
): TurbineSheet {
  const sheet = turbineExample(given.turbine ?? 'Q01', given.standingDeg ?? 0.2)
  return {
    ...sheet,
    model: 'M1',
    verdict: given.verdict ?? 'aligned',
    reason: 'the reason of the verdict',
    sensors: given.sensors ?? [],
    staticOffset: { ...sheet.staticOffset, changes: given.changes ?? [] },
  }
}

function found(
  sensor: SensorFinding['sensor'],
  kind: SensorFinding['kind'],
  given: Partial<SensorFinding> = {},
): SensorFinding {
  return {
    sensor,
    kind,
    finding: `what was seen of ${kind}`,
    severity: 'warn',
    howSure: 'likely',
    checkFirst: `Then look at ${kind}.`,
    from: '2026-03-05T00:00:00.000Z',
    to: '2026-03-08T00:00:00.000Z',
    detail: {},
    ...given,
  }
}

const change = (given: Partial<Change> = {}): Change => ({
  at: '2026-03-14T09:20:00.000Z',
  from: '2026-03-14T08:00:00.000Z',
  to: '2026-03-14T10:00:00.000Z',
  fromDeg: 0.1,
  toDeg: 7.1,
  sizeDeg: 7,
  sizeInterval95Deg: [6.1, 7.9],
  seenIn: 'both',
  ...given,
})

const alone = (given: Parameters<typeof sheetOf>[0]): Attribution => attributions([sheetOf(given)], 3)[0]!

test('a turbine without findings gets a plain sentence, and nothing to check', () => {
  expect(alone({})).toEqual({
    text: 'No sensor and no drive shows a fault, and the turbine stands to the wind.',
    evidence: [],
    wouldSettle: [],
  })
  expect(alone({ verdict: 'undetermined' }).text).toContain('is open: the reason of the verdict.')
})

test('an offset that changed on the day the vane began to read otherwise: the vane was touched or replaced', () => {
  const noise = found('vane', 'noise-changed', { from: '2026-03-14T00:00:00.000Z', to: null })
  const touched = alone({ verdict: 'offset', standingDeg: 7, changes: [change()], sensors: [noise] })
  expect(touched.text).toMatch(
    /^The vane was touched or replaced: its offset changed by \+7\.0 degrees \[\+6\.1, \+7\.9\] about 2026-03-14 09:20 UTC/,
  )
  expect(touched.evidence).toContain('vane: what was seen of noise-changed (likely)')
  expect(touched.wouldSettle[0]).toContain('work orders')

  const before = found('vane', 'noise-changed', { from: '2026-03-04T00:00:00.000Z', to: null })
  const apart = alone({ verdict: 'offset', standingDeg: 7, changes: [change()], sensors: [before] })
  expect(apart.text).toMatch(/^The vane moved on its mount/)
  expect(apart.text).toContain('Vane: the vane itself has changed')
})

test('an offset that changed as a frozen spell ended was moved by the ice', () => {
  const ice = found('vane', 'icing', { to: '2026-03-14T08:00:00.000Z' })
  expect(alone({ verdict: 'offset', standingDeg: 7, changes: [change()], sensors: [ice] }).text).toMatch(
    /^The vane was moved, by ice/,
  )
})

test('a change that the site file names is told as such', () => {
  const { text } = alone({ changes: [change({ seenIn: 'event' })] })
  expect(text).toContain('when the site file says')
})

test('a north step without a power change is the position sensor alone, and no climb to the vane', () => {
  const { text, wouldSettle } = alone({ sensors: [found('nacelle-position', 'position-step')] })
  expect(text).toMatch(/stepped \(from 2026-03-05 00:00 UTC to 2026-03-08 00:00 UTC\) while power/)
  expect(text).toContain('position sensor or its north parameter alone')
  expect(wouldSettle).toEqual(['Then look at position-step.'])
})

test('a vane that stands still in the cold is ice, more so with the anemometer beside it', () => {
  const vane = found('vane', 'icing')
  const other = found('anemometer', 'icing', { from: '2026-03-06T00:00:00.000Z' })
  expect(alone({ sensors: [vane] }).text).toMatch(/^Ice: the vane stood still in the cold from/)
  const both = alone({ sensors: [vane, other] })
  expect(both.text).toContain('and the anemometer with it')
  expect(both.text).not.toContain('Anemometer:')
  expect(both.evidence).toHaveLength(2)
})

test('a vane that stands still without cold is the vane, or the logger where the anemometer stands with it', () => {
  expect(alone({ sensors: [found('vane', 'frozen')] }).text).toContain('its bearing, its transducer')
  expect(alone({ sensors: [found('vane', 'frozen'), found('anemometer', 'frozen')] }).text).toContain(
    'held its last values',
  )
})

test('a model that is off the same way has one cause, not one vane each; a turbine beyond the others its own besides', () => {
  const standing = [5.2, 4.1, 6, 4.8, 12.5]
  const sheets = standing.map((standingDeg, i) =>
    sheetOf({ turbine: `Q0${i + 1}`, verdict: 'offset', standingDeg }),
  )
  const weighed = attributions(sheets, 3)
  for (const { text } of weighed) {
    expect(text).toContain('All 5 turbines of model M1 stand off the same way (median +5.2 degrees')
    expect(text).not.toContain('zero mark')
  }
  expect(weighed[4]!.text).toContain('beyond the others (+7.3 degrees) is its own')
  expect(weighed[0]!.text).not.toContain('is its own')
  expect(weighed[0]!.wouldSettle.at(-1)).toContain('nacelle lidar')

  const mixed = attributions(
    [5.2, -4.1, 0.3, 0.8, -6].map((standingDeg) => sheetOf({ verdict: 'offset', standingDeg })),
    3,
  )
  for (const { text } of mixed) expect(text).not.toContain('same way')
  expect(mixed[0]!.text).toContain('the zero mark of the vane or the offset in the controller')
})

test('more than ten degrees is a damaged vane before it is a setting', () => {
  expect(alone({ verdict: 'offset', standingDeg: -12 }).text).toMatch(/by -12\.0 degrees.*bent, loose/)
})

test('a nacelle that hunts after a noisy vane asks for the vane, alone for controller and drive', () => {
  const hunting = found('controller', 'hunting')
  expect(alone({ sensors: [hunting, found('vane', 'noise-changed')] }).text).toContain(
    'mend the vane before the drive',
  )
  expect(alone({ sensors: [hunting] }).text).toContain('goes back and forth within minutes')
})

test('of two vanes that part, power tells which one moved', () => {
  const apart = found('vane', 'two-vanes-apart')
  expect(alone({ sensors: [apart] }).text).toContain('so the other is the likelier')
  expect(alone({ sensors: [apart], changes: [change({ seenIn: 'power' })] }).text).toContain(
    'it is the one the controller goes by that moved',
  )
})

test('what no rule takes up is told all the same, and what is only information does not hide that nothing is wrong', () => {
  expect(alone({ sensors: [found('clock', 'clock-off')] }).text).toBe('Besides: what was seen of clock-off.')
  expect(alone({ sensors: [found('nacelle-position', 'north-offset', { severity: 'info' })] }).text).toBe(
    'No sensor and no drive shows a fault, and the turbine stands to the wind. ' +
      'The north of its position is not that of the farm: a parameter, from which no yaw error follows.',
  )
})

test('a blocked turbine says first what forbids an estimate', () => {
  const { text } = alone({
    verdict: 'blocked',
    standingDeg: null,
    sensors: [found('vane', 'reversed-sign', { severity: 'fault' })],
  })
  expect(text).toBe('Nothing can be said of the offset before this is put right: the reason of the verdict.')
})

test('desk checks come before climbs', () => {
  const { wouldSettle } = alone({
    verdict: 'offset',
    standingDeg: 6,
    sensors: [
      found('vane', 'stuck-bit'),
      found('nacelle-position', 'zero-lost', { checkFirst: 'At the desk: alarms.' }),
    ],
  })
  const desk = wouldSettle.map((check) => check.startsWith('At the desk'))
  expect(desk).toEqual([...desk].sort((a, b) => Number(b) - Number(a)))
  expect(desk).toContain(false)
  expect(new Set(wouldSettle).size).toBe(wouldSettle.length)
})
