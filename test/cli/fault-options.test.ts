import { expect, test } from 'vitest'
import { faultsHelp, parseCorrection, parseFault } from '../../src/cli/fault-options.ts'
import { FAULT_KINDS, farmScenario } from '../../src/simulate/index.ts'

const farm = farmScenario({ turbines: 8, startMs: Date.UTC(2026, 2, 1) })
const DAY_S = 86400

test('a fault is read from its turbine, kind, start and end, and numbers where they are given', () => {
  expect(parseFault('Q03:frozen:2026-03-05:2026-03-08', farm)).toEqual({
    turbine: 2,
    kind: 'vane-frozen',
    fromS: 4 * DAY_S,
    toS: 7 * DAY_S,
  })
  expect(parseFault('Q08:vane-dead-sector:2026-03-05T06:30Z:2026-03-08T00:00:10Z:12.5:-40', farm)).toEqual({
    turbine: 7,
    kind: 'vane-dead-sector',
    fromS: 4 * DAY_S + 6.5 * 3600,
    toS: 7 * DAY_S + 10,
    size: 12.5,
    place: -40,
  })
})

test('a correction adds what it records, the reverse, or nothing', () => {
  const added = (how: string) => parseCorrection(`Q04:2026-03-15T10:00Z:6${how}`, farm)
  expect(added('')).toEqual({ turbine: 3, atS: 14 * DAY_S + 36000, recordedDeg: 6, addedDeg: 6 })
  expect(added(':right').addedDeg).toBe(6)
  expect(added(':wrong-sign').addedDeg).toBe(-6)
  expect(added(':not-entered').addedDeg).toBe(0)
})

test.each([
  ['Q03:frozen:2026-03-05', 'expected TURBINE:KIND:FROM:TO'],
  ['Q03:frozen:2026-03-05:2026-03-08:much', 'expected TURBINE:KIND:FROM:TO'],
  ['Q09:frozen:2026-03-05:2026-03-08', 'expected a turbine of Q01 to Q08, got "Q09"'],
  ['Q03:stuck:2026-03-05:2026-03-08', 'expected one of nacelle-stuck, anemometer-stuck, got "stuck"'],
  ['Q03:melted:2026-03-05:2026-03-08', 'expected one of vane-frozen'],
  ['Q03:frozen:2026-13-05:2026-14-08', 'a date that exists'],
])('%s is refused, and the message says what is wrong', (text, message) => {
  expect(() => parseFault(text, farm)).toThrow(
    expect.objectContaining({ code: 'BAD_OPTION', message: expect.stringContaining(message) as string }),
  )
})

test('a correction that cannot be read is refused', () => {
  expect(() => parseCorrection('Q04:2026-03-15:six', farm)).toThrow(
    expect.objectContaining({
      code: 'BAD_OPTION',
      message: expect.stringContaining('TURBINE:AT:DEGREES') as string,
    }),
  )
})

test('the help names every kind once', () => {
  const lines = faultsHelp().split('\n')
  expect(lines.map((line) => line.trim().split(' ')[0])).toEqual(FAULT_KINDS)
})
