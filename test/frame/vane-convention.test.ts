import { expect, test } from 'vitest'
import { buildFrame, type TurbineColumns, type TurbineFrame } from '../../src/frame/index.ts'
import type { SiteFile } from '../../src/sheet/index.ts'
import { columnsOf } from './columns.ts'
import { SETTINGS } from './settings.ts'

const N = 1440
const VANE = Float64Array.from({ length: N }, (_, i) => 2 + 5 * Math.sin(i * 1.7))
const HEADING = Float64Array.from({ length: N }, (_, i) => 180 * Math.sin(i / 90) + 350)

const wrap360 = (angle: number): number => ((angle % 360) + 360) % 360
const wrap180 = (angle: number): number => wrap360(angle + 180) - 180

function frameOf(columns: TurbineColumns, vane: object = {}): TurbineFrame {
  const site: SiteFile = { turbines: [{ turbine: 'T1', vane }] }
  return buildFrame([columns], { site, settings: SETTINGS, intervalS: 600 }).turbines[0]!
}

function largestGap(a: Float64Array, b: Float64Array): number {
  return a.reduce((most, angle, i) => Math.max(most, Math.abs(wrap180(angle - b[i]!))), 0)
}

const plain = frameOf(columnsOf(N, { vane: VANE, nacelle_position: HEADING.map(wrap360) }))

test.each([
  ['0 to 360', VANE.map(wrap360), {}, HEADING.map(wrap360)],
  ['centred on 180', VANE.map((angle) => angle + 180), {}, HEADING.map(wrap360)],
  ['centred on 180, signed', VANE.map((angle) => wrap180(angle + 180)), {}, HEADING.map(wrap360)],
  [
    'counter-clockwise, sign stated',
    VANE.map((angle) => -angle),
    { sign: -1 as const },
    HEADING.map(wrap360),
  ],
  [
    'counter-clockwise and centred on 180',
    VANE.map((angle) => 180 - angle),
    { sign: -1 as const },
    HEADING.map(wrap360),
  ],
  ['with a signed nacelle', VANE, {}, HEADING.map(wrap180)],
  ['with a wound nacelle', VANE, {}, HEADING.map((angle) => angle + 720)],
  ['with a nacelle that writes 360', VANE, {}, HEADING.map((angle) => wrap360(angle) || 360)],
])('a vane %s gives the same frame', (_, vane, setup, nacelle) => {
  const frame = frameOf(columnsOf(N, { vane, nacelle_position: nacelle }), setup)
  expect(largestGap(frame.vane, plain.vane)).toBeLessThan(1e-9) // sums of angles up to 1300 round at 1e-13
  expect(largestGap(frame.indicatedDirection, plain.indicatedDirection)).toBeLessThan(1e-9)
  expect(frame.reason).toEqual(plain.reason)
})

test('a vane taken as centred on 180 is noted, one whose centre is stated is not', () => {
  const vane = VANE.map((angle) => angle + 180)
  expect(frameOf(columnsOf(N, { vane })).notes.join()).toContain('centred on 180')
  const stated = frameOf(columnsOf(N, { vane }), { centre: 180 })
  expect(stated.notes.join()).not.toContain('180')
  expect(largestGap(stated.vane, plain.vane)).toBeLessThan(1e-9)
  // Stated otherwise, the log is believed: such a turbine runs backwards, and the vane says so.
  expect(frameOf(columnsOf(N, { vane }), { centre: 0 }).vane[0]).toBe(-178)
})

test('a vane that is 25 degrees off is no vane centred on 180', () => {
  const frame = frameOf(columnsOf(N, { vane: VANE.map((angle) => angle + 25) }))
  expect(frame.vane[0]).toBe(27)
  expect(frame.notes.join()).not.toContain('180')
})

test('only rows that produce tell where a vane is centred', () => {
  // Parked three days in four, the vane hangs astern.
  const stopped = (i: number): boolean => i % 576 >= 144
  const columns = columnsOf(N, { vane: VANE.map((angle, i) => (stopped(i) ? angle + 180 : angle)) })
  const power = columns.numbers['power']!.map((kw, i) => (stopped(i) ? -3 : kw))
  const frame = frameOf({ ...columns, numbers: { ...columns.numbers, power } })
  expect(frame.vane[0]).toBe(2)
  expect(frame.vane[200]).toBeCloseTo(wrap180(VANE[200]! + 180), 9)
})

test('without a vane, wind direction less nacelle position stands in, and a note calls it an approximation', () => {
  const { numbers, ...rest } = columnsOf(N)
  const others = Object.fromEntries(Object.entries(numbers).filter(([channel]) => channel !== 'vane'))
  const wind = HEADING.map((angle, i) => wrap360(angle + VANE[i]!))
  const frame = frameOf({
    ...rest,
    numbers: { ...others, wind_direction: wind, nacelle_position: HEADING.map(wrap360) },
  })
  expect(largestGap(frame.vane, plain.vane)).toBeLessThan(1e-9)
  expect(frame.notes.join()).toContain('approximations')
})

test('extremes are turned with the vane, a reversal swaps them, a spread stays', () => {
  const numbers = {
    vane: VANE.map((angle) => wrap180(angle + 180)),
    vane_min: VANE.map((angle) => wrap180(angle + 180) - 7),
    vane_max: VANE.map((angle) => wrap180(angle + 180) + 3),
    vane_sd: VANE.map(() => 2.5),
  }
  const turned = frameOf(columnsOf(N, numbers))
  const reversed = frameOf(columnsOf(N, numbers), { sign: -1 })
  for (const i of [0, 1, 2]) {
    expect(turned.vaneMin[i]! - turned.vane[i]!).toBeCloseTo(-7, 9)
    expect(turned.vaneMax[i]! - turned.vane[i]!).toBeCloseTo(3, 9)
    expect(reversed.vaneMin[i]! - reversed.vane[i]!).toBeCloseTo(-3, 9)
    expect(reversed.vaneMax[i]! - reversed.vane[i]!).toBeCloseTo(7, 9)
    expect(reversed.vaneSd[i]).toBe(2.5)
  }
  // A reading that wrapped inside the interval: its extremes are the ends of the scale.
  const wrapped = { vane: VANE.map(wrap360), vane_min: VANE.map(() => 0.1), vane_max: VANE.map(() => 359.9) }
  expect(frameOf(columnsOf(N, wrapped)).vaneMin[0]).toBeNaN()
})

test('turns of a wound nacelle are kept as they are', () => {
  const wound = HEADING.map((angle) => angle - 720)
  expect(frameOf(columnsOf(N, { nacelle_position: wound })).nacellePosition).toEqual(wound)
})

test('a step from 359.9 to 0.1 is neither a move nor a change of direction', () => {
  const still = Float64Array.from({ length: N }, (_, i) => (i % 2 === 0 ? 359.9 : 0.1))
  const vane = new Float64Array(N).fill(1)
  const frame = frameOf(columnsOf(N, { vane, nacelle_position: still }))
  expect(frame.reason).toEqual(frameOf(columnsOf(N, { vane, nacelle_position: still.map(() => 77) })).reason)
})

test('a column that points anywhere while producing is called no vane', () => {
  const vane = Float64Array.from({ length: N }, (_, i) => (i * 7) % 360)
  expect(frameOf(columnsOf(N, { vane })).notes.join()).toContain('points anywhere')
})
