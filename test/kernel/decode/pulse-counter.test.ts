import { expect, test } from 'vitest'
import { countsPerTurn, degPerCount, PulseCounter } from '../../../src/kernel/decode/index.ts'

/** Levels of A and B in one period forwards: 00, 01, 11, 10. */
const CYCLE = [
  [0, 0],
  [0, 1],
  [1, 1],
  [1, 0],
] as const

/** Levels at counts, Z high at the counts that are 0 and 1 of a turn. */
function levelsAt(counts: readonly number[], perTurn = Infinity) {
  const phase = (count: number): readonly [number, number] => CYCLE[((count % 4) + 4) % 4]!
  return {
    a: Float64Array.from(counts, (count) => phase(count)[0]),
    b: Float64Array.from(counts, (count) => phase(count)[1]),
    z: Float64Array.from(counts, (count) => (((count % perTurn) + perTurn) % perTurn <= 1 ? 1 : 0)),
  }
}

const to = (from: number, end: number): number[] =>
  Array.from({ length: Math.abs(end - from) + 1 }, (_, i) => from + Math.sign(end - from) * i)

test('each change of A and B counts as the table of a microcontroller guide has it', () => {
  // TI MSP430x4xx guide, table 24-8; levels AB before > after.
  const table: [string, number | 'error'][] = [
    ['00>01', 1],
    ['01>11', 1],
    ['11>10', 1],
    ['10>00', 1],
    ['00>10', -1],
    ['10>11', -1],
    ['11>01', -1],
    ['01>00', -1],
    ['00>00', 0],
    ['11>11', 0],
    ['00>11', 'error'],
    ['11>00', 'error'],
    ['01>10', 'error'],
    ['10>01', 'error'],
  ]
  for (const [change, expected] of table) {
    const [from, after] = change.split('>') as [string, string]
    const { count, jumps } = new PulseCounter({ pulsesPerTurn: 100 }).add({
      a: Float64Array.of(Number(from[0]), Number(after[0])),
      b: Float64Array.of(Number(from[1]), Number(after[1])),
    })
    expect(count[1], change).toBe(expected === 'error' ? 0 : expected)
    expect(jumps, change).toEqual(expected === 'error' ? [1] : [])
  }
})

test('a log counts the same whole and in pieces, there and back', () => {
  const path = [...to(0, 37), ...to(36, -12)]
  const whole = new PulseCounter({ pulsesPerTurn: 9 }).add(levelsAt(path))
  expect([...whole.count]).toEqual(path)
  const counter = new PulseCounter({ pulsesPerTurn: 9 })
  const parts = [path.slice(0, 11), path.slice(11, 12), path.slice(12)].flatMap((part) => [
    ...counter.add(levelsAt(part)).count,
  ])
  expect(parts).toEqual(path)
})

test('a row without a level is passed over', () => {
  const levels = levelsAt([0, 1, 2, 2, 3])
  levels.a[0] = NaN
  levels.b[3] = NaN
  const { count, jumps } = new PulseCounter({ pulsesPerTurn: 9 }).add(levels)
  expect([...count]).toEqual([NaN, 0, 1, 1, 2])
  expect(jumps).toEqual([])
})

test('an index pulse in its place changes nothing, whichever way it is passed', () => {
  const path = [...to(-3, 90), ...to(89, -20), ...to(-19, 50)]
  const { count, indexErrors, indexPulses } = new PulseCounter({ pulsesPerTurn: 10 }).add(levelsAt(path, 40))
  // 0, 40, 80; 80, 40, 0; 0, 40: eight passages.
  expect(indexPulses).toBe(8)
  expect(indexErrors).toEqual([])
  expect([...count]).toEqual(path.map((at) => at + 3))
})

test('pulses that went missing show at the next index, which sets the count right', () => {
  // Between two rows the disc goes on by 8 counts, two whole periods: the levels are the same, and nothing shows.
  const path = [...to(-2, 10), ...to(18, 60)]
  const { count, jumps, indexErrors } = new PulseCounter({ pulsesPerTurn: 10 }).add(levelsAt(path, 40))
  expect(jumps).toEqual([])
  const row = path.indexOf(40)
  expect(indexErrors).toEqual([{ row, counts: -8 }])
  expect(count[row - 1]).toBe(39 + 2 - 8)
  expect(count[row]).toBe(42)
  expect(count.at(-1)).toBe(62)
})

test('pulse and direction: each rise of A counts one, the way B says', () => {
  const { count } = new PulseCounter({ pulsesPerTurn: 8, quadrature: false }).add({
    a: Float64Array.of(0, 1, 1, 0, 1, 0, 1, 0),
    b: Float64Array.of(1, 1, 1, 1, 1, 0, 0, 0),
  })
  expect([...count]).toEqual([0, 1, 1, 1, 2, 2, 1, 1])
})

test('eight pulses make 45 degrees, 360 make 1, quadrature a quarter, a gear of 150 a hundred-and-fiftieth', () => {
  expect(degPerCount({ pulsesPerTurn: 8, quadrature: false })).toBe(45)
  expect(degPerCount({ pulsesPerTurn: 360, quadrature: false })).toBe(1)
  expect(degPerCount({ pulsesPerTurn: 360 })).toBe(0.25)
  expect(degPerCount({ pulsesPerTurn: 1, quadrature: false, gearRatio: 150 })).toBeCloseTo(2.4, 12)
  expect(countsPerTurn({ pulsesPerTurn: 360 })).toBe(1440)
})

test('scales that no encoder has and tracks of different length are refused', () => {
  const refused = (code: string): unknown => expect.objectContaining({ code })
  expect(() => new PulseCounter({ pulsesPerTurn: NaN })).toThrow(refused('OUT_OF_RANGE'))
  expect(() => degPerCount({ pulsesPerTurn: 8, gearRatio: 0 })).toThrow(refused('OUT_OF_RANGE'))
  expect(() =>
    new PulseCounter({ pulsesPerTurn: 8 }).add({ a: new Float64Array(2), b: new Float64Array(3) }),
  ).toThrow(refused('LENGTH_MISMATCH'))
})
