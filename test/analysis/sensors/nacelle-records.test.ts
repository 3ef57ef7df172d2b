import { expect, test } from 'vitest'
import { nacelleFindings, nacelleNorth, nacelleRecords, withTrueNorth } from '../../../src/analysis/index.ts'
import type { TurbineSheet } from '../../../src/sheet/index.ts'
import { normals } from '../../kernel/stats/normals.ts'
import { DAY_MS, FIRST_MS, madeFarm, stepAt, type Made } from '../changes/offset-changes-farm.ts'

const DAYS = 24
/** North offsets as farms have them: no single one is to be trusted. */
const STEADY: Made[] = [
  { northDeg: () => 40 },
  { offsetDeg: () => 3, northDeg: () => 3 },
  { northDeg: () => -120 },
  { northDeg: () => 0.5 },
]
const NO_STEPS = { positionSteps: [], undecided: [] }
const recordsOf = (first: Made, seed = 1) => {
  const frame = madeFarm(DAYS, [first, ...STEADY], seed)
  return { frame, ...nacelleRecords(frame, []) }
}
const kindsOf = (made: Made): string[] => {
  const { frame, turbines } = recordsOf(made)
  return nacelleFindings(frame.turbines[0]!, turbines[0]!, NO_STEPS).map(({ kind }) => kind)
}

test('north of each turbine is told against the consensus, whose median turbine has none', () => {
  const { turbines } = recordsOf({ offsetDeg: () => -2, northDeg: () => 168 })
  // n - d: 170, 40, 0, -120, 0.5; the median of the circle is 0.5.
  const expected = [169.5, 39.5, -0.5, -120.5, 0]
  turbines.forEach(({ state, levels }, i) => {
    expect(state).toBe('compared')
    expect(levels).toHaveLength(1)
    // 2 degrees of local noise over 3456 rows is 0.03 degrees; lower medians of bins and the scale's own zero add some tenths.
    expect(Math.abs(levels[0]!.deg - expected[i]!), `turbine ${i}`).toBeLessThan(0.4)
    expect(levels[0]!.halfWidthDeg).toBeLessThan(0.5)
  })
})

test('a step parts the pieces, and its north is that of the last one', () => {
  const { turbines } = recordsOf({ northDeg: stepAt(10.4, 15, 39) })
  const north = nacelleNorth(turbines[0]!, { estimateDeg: 1, interval95Deg: [0, 2] })
  expect(north.pieces).toHaveLength(2)
  expect(Math.abs(Date.parse(north.pieces[1]!.from) - FIRST_MS - 10.4 * DAY_MS)).toBeLessThan(DAY_MS / 12)
  const [before, after] = north.pieces.map((piece) => piece.northMinusVaneOffsetDeg)
  expect(Math.abs(after! - before! - 24)).toBeLessThan(0.5)
  expect(north.northMinusVaneOffsetDeg).toBe(after)
  // n is that plus d, and its interval holds that of d.
  expect(north.northOffsetDeg! - after!).toBeCloseTo(1, 10)
  const [low, high] = north.northInterval95Deg
  expect(high! - low!).toBeGreaterThan(2)
  expect(high! - low!).toBeLessThan(2.3)
})

test('a zero that is lost again and again is one finding, and no step', () => {
  const draw = normals(5)
  const zeros = Array.from({ length: 15 }, () => 70 * draw())
  const made = { northDeg: (day: number) => zeros[Math.floor(day / 1.7)]! }
  const { turbines } = recordsOf(made)
  expect(turbines[0]!.state).toBe('zero-lost')
  expect(turbines[0]!.heading).toBeNull()
  expect(turbines[0]!.zeroLost!.jumps).toBeGreaterThan(8)
  expect(turbines.slice(1).map(({ state }) => state)).toEqual([
    'compared',
    'compared',
    'compared',
    'compared',
  ])
  expect(kindsOf(made)).toEqual(['zero-lost'])
  // Each piece tells its own north: the zero at day 4 is the third one drawn.
  const day4 = turbines[0]!.levels.find(({ fromMs, toMs }) => {
    const at = FIRST_MS + 4 * DAY_MS
    return fromMs <= at && at < toMs
  })!
  const difference = day4.deg + 0.5 - zeros[2]!
  expect(Math.abs(difference - 360 * Math.round(difference / 360))).toBeLessThan(2)
})

test('a slow slip is one slip and not a flight of steps', () => {
  const slipping = { northDeg: (day: number) => Math.max(0, Math.min(12, day - 5)) }
  const { turbines } = recordsOf(slipping)
  expect(turbines[0]!.slips).toHaveLength(1)
  const slip = turbines[0]!.slips[0]!
  expect(slip.with).toBe('time')
  expect(Math.abs(slip.degPerDay - 1)).toBeLessThan(0.15)
  expect(Math.abs(slip.sizeDeg - 12)).toBeLessThan(1)
  expect(turbines[0]!.heading).toMatchObject({ steps: [], whole: false })
  expect(kindsOf(slipping)).toContain('slow-slip')
})

test('a position that is noise says nothing, of itself or of the others', () => {
  const draw = normals(9)
  const { turbines } = recordsOf({ northDeg: () => 1000 * draw() })
  const { turbines: without } = recordsOf({ position: false })
  expect(turbines[0]).toMatchObject({ state: 'unrelated', heading: null, levels: [] })
  expect(without[0]).toMatchObject({ state: 'missing', heading: null, levels: [] })
  expect(turbines.slice(1).map(({ heading }) => heading)).toEqual(
    without.slice(1).map(({ heading }) => heading),
  )
})

test('a position that stands still while the wind turns is stuck, and makes no steps', () => {
  const frame = madeFarm(DAYS, [{}, ...STEADY])
  const one = frame.turbines[0]!
  const [from, to] = [1000, 1300]
  const position = one.nacellePosition.map((value, i) =>
    i >= from && i < to ? one.nacellePosition[from]! : value,
  )
  const stuck = {
    ...one,
    nacellePosition: position,
    indicatedDirection: position.map((value, i) => (((value + one.vane[i]!) % 360) + 360) % 360),
  }
  const { turbines } = nacelleRecords({ ...frame, turbines: [stuck, ...frame.turbines.slice(1)] }, [])
  expect(turbines[0]!.stuck).toHaveLength(1)
  expect(turbines[0]!.stuck[0]).toMatchObject({ fromMs: one.time[from], toMs: one.time[to] })
  expect(turbines[0]!.heading!.steps).toEqual([])
})

test('true north moves the scale, and its uncertainty is carried', () => {
  const { turbines } = recordsOf({ northDeg: () => 15 })
  const staticOffset = { estimateDeg: null, interval95Deg: [null, null] }
  const nacelle = nacelleNorth(turbines[0]!, staticOffset)
  const sheet = { nacelle, staticOffset } as unknown as TurbineSheet
  expect(withTrueNorth(sheet, null).absolute).toBeNull()
  const { absolute } = withTrueNorth(sheet, { source: 'wakes', shiftDeg: -170, halfWidthDeg: 1.5, note: '' })
  const expected = nacelle.northMinusVaneOffsetDeg! - 170
  expect(absolute!.northMinusVaneOffsetDeg).toBeCloseTo(expected, 10)
  expect(absolute!.northOffsetDeg).toBeNull()
  const [low, high] = absolute!.interval95Deg
  expect(high! - low!).toBeGreaterThan(3)
  expect(high! - low!).toBeLessThan(3.5)
})
