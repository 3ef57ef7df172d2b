import fc from 'fast-check'
import { expect, test } from 'vitest'
import {
  countReasons,
  REASON_CODE,
  setAsideBeforeCurve,
  setAsideByRange,
  type SetAsideInput,
} from '../../src/frame/index.ts'
import { SET_ASIDE_REASONS } from '../../src/sheet/index.ts'
import { SETTINGS } from './settings.ts'

const TEN_MINUTES = 600_000

/** Ten rows that nothing sets aside, and one of them, row 5, changed by the test. */
function input(change: Partial<SetAsideInput> = {}, n = 10): SetAsideInput {
  return {
    time: Float64Array.from({ length: n }, (_, i) => i * TEN_MINUTES),
    intervalMs: TEN_MINUTES,
    ratedPowerKw: 2000,
    windSpeed: new Float64Array(n).fill(8),
    vane: new Float64Array(n).fill(1),
    power: new Float64Array(n).fill(900),
    excluded: [],
    ...change,
  }
}

/** Values of n rows: `usual` everywhere but where `changed` says otherwise. */
function series(usual: number, changed: Record<number, number> = {}, n = 10): Float64Array {
  return Float64Array.from({ length: n }, (_, i) => changed[i] ?? usual)
}

/** Name of each row's reason. */
function reasons(given: SetAsideInput): string[] {
  return named(setAsideBeforeCurve(given, SETTINGS).reason)
}

function named(codes: Uint8Array): string[] {
  return Array.from(codes, (code) => (code === 0 ? 'used' : SET_ASIDE_REASONS[code - 1]!))
}

/** All rows used but those of `changed`. */
function usedBut(changed: Record<number, string>, n = 10): string[] {
  return Array.from({ length: n }, (_, i) => changed[i] ?? 'used')
}

test('quiet rows with wind speed, vane and power alone are all used', () => {
  expect(reasons(input())).toEqual(usedBut({}))
})

test('an interval made of less than 0.75 of its rows is set aside and does not count as running', () => {
  const given = input({ coverage: series(1, { 3: 0.75, 4: 0.7499, 5: NaN }) })
  expect(reasons(given)).toEqual(usedBut({ 4: 'incomplete-interval', 5: 'incomplete-interval' }))
  const { running } = setAsideBeforeCurve(given, SETTINGS)
  expect(Array.from(running)).toEqual([1, 1, 1, 1, 0, 0, 1, 1, 1, 1])
  const withoutVane = input({ coverage: series(1, { 5: 0.1 }), vane: series(1, { 5: NaN }) })
  expect(reasons(withoutVane)).toEqual(usedBut({ 5: 'missing-channel' })) // the first reason in order holds
})

test('a missing wind speed, vane or power sets its own row aside', () => {
  for (const channel of ['windSpeed', 'vane', 'power'] as const) {
    const usual = { windSpeed: 8, vane: 1, power: 900 }[channel]
    expect(reasons(input({ [channel]: series(usual, { 5: NaN }) })), channel).toEqual(
      usedBut({ 5: 'missing-channel' }),
    )
  }
})

test('a window is excluded from the row that holds its start to the row before its end', () => {
  // 15 to 40 minutes: rows at 10, 20 and 30; the row at 40 starts when the window ends.
  const excluded = [[15 * 60_000, 40 * 60_000]] as const
  expect(reasons(input({ excluded }))).toEqual(usedBut({ 1: 'excluded', 2: 'excluded', 3: 'excluded' }))
})

test('a stop sets its row aside, and the rows on either side as transitions', () => {
  const stop = { 4: 'transition', 5: 'not-running', 6: 'transition' }
  expect(reasons(input({ power: series(900, { 5: 0 }) }))).toEqual(usedBut(stop))
  expect(reasons(input({ power: series(900, { 5: -12 }) }))).toEqual(usedBut(stop))
  expect(reasons(input({ pitch: series(0, { 5: 88 }) }))).toEqual(usedBut(stop))
  expect(reasons(input({ rotorSpeed: series(11, { 5: 1 }) }))).toEqual(usedBut(stop))
})

test('a missing pitch or rotor speed stops nothing', () => {
  expect(reasons(input({ pitch: series(NaN), rotorSpeed: series(NaN) }))).toEqual(usedBut({}))
  expect(reasons(input({ pitch: series(0, { 5: NaN }), rotorSpeed: series(11, { 5: NaN }) }))).toEqual(
    usedBut({}),
  )
})

test('the status stops a turbine only when the site file names the running ones', () => {
  const status = Array.from({ length: 10 }, (_, i) => (i === 5 ? 'service' : 'run'))
  const stop = { 4: 'transition', 5: 'not-running', 6: 'transition' }
  expect(reasons(input({ status }))).toEqual(usedBut({}))
  expect(reasons(input({ status, runningStatus: ['run'] }))).toEqual(usedBut(stop))
  expect(reasons(input({ status, runningStatus: ['run', 'service'] }))).toEqual(usedBut({}))
  const unknown = status.map((value, i) => (i === 5 ? null : value))
  expect(reasons(input({ status: unknown, runningStatus: ['run'] }))).toEqual(usedBut({}))
})

test('categories of IEC 61400-26: full performance is used, partial is limited, all others do not run', () => {
  const category = (value: string | null) =>
    reasons(
      input({ availability: Array.from({ length: 10 }, (_, i) => (i === 5 ? value : 'FULL PERFORMANCE')) }),
    )
  for (const full of [
    'FULL PERFORMANCE',
    'Full Performance',
    'full_performance',
    'IAOGFP - full performance',
    null,
  ]) {
    expect(category(full), String(full)).toEqual(usedBut({}))
  }
  for (const partial of ['PARTIAL PERFORMANCE', 'partial-performance']) {
    expect(category(partial), partial).toEqual(usedBut({ 5: 'limited' }))
  }
  for (const other of [
    'READY STANDBY',
    'TECHNICAL STANDBY',
    'OUT OF ENVIRONMENTAL SPECIFICATION',
    'REQUESTED SHUTDOWN',
    'OUT OF ELECTRICAL SPECIFICATION',
    'SCHEDULED MAINTENANCE',
    'PLANNED CORRECTIVE ACTION',
    'FORCED OUTAGE',
    'SUSPENDED',
    'FORCE MAJEURE',
  ]) {
    expect(category(other), other).toEqual(usedBut({ 4: 'transition', 5: 'not-running', 6: 'transition' }))
  }
})

test('power that falls to nothing inside a row is a transition', () => {
  expect(reasons(input({ powerMin: series(400, { 5: 0 }) }))).toEqual(usedBut({ 5: 'transition' }))
  expect(reasons(input({ powerMin: series(400, { 5: NaN }) }))).toEqual(usedBut({}))
})

test('a yaw move inside a row shows in its lowest and highest nacelle reading', () => {
  const nacelle = series(120)
  const logged = (span: number) => ({
    nacellePosition: nacelle,
    nacelleMin: series(119, { 5: 120 - span / 2 }),
    nacelleMax: series(121, { 5: 120 + span / 2 }),
  })
  expect(reasons(input(logged(4.9)))).toEqual(usedBut({}))
  expect(reasons(input(logged(5.1)))).toEqual(usedBut({ 5: 'transition' }))
  // A span of 180 or more is a reading that wrapped through north: the means before and after decide, and they stand still.
  expect(reasons(input(logged(359)))).toEqual(usedBut({}))
})

test('a yaw move inside a row shows as a step on both sides of it', () => {
  const moved = (by: number, wrapAt = 1e9) =>
    Float64Array.from({ length: 10 }, (_, i) => {
      const position = 100 + (i < 5 ? 0 : i === 5 ? by / 2 : by)
      return position >= wrapAt ? position - 360 : position
    })
  expect(reasons(input({ nacellePosition: moved(4.9) }))).toEqual(usedBut({}))
  expect(reasons(input({ nacellePosition: moved(8) }))).toEqual(usedBut({ 5: 'transition' }))
  expect(reasons(input({ nacellePosition: moved(-8) }))).toEqual(usedBut({ 5: 'transition' }))
  // The same move where the reading wraps, or is wound over several turns.
  expect(reasons(input({ nacellePosition: moved(8, 103) }))).toEqual(usedBut({ 5: 'transition' }))
  expect(reasons(input({ nacellePosition: moved(8).map((position) => position + 720) }))).toEqual(
    usedBut({ 5: 'transition' }),
  )
})

test('a move at the edge between two rows lies inside neither', () => {
  const nacellePosition = Float64Array.from({ length: 10 }, (_, i) => (i < 5 ? 100 : 112))
  expect(reasons(input({ nacellePosition }))).toEqual(usedBut({}))
})

test('a set-point below rated power limits, one at rated power does not', () => {
  expect(reasons(input({ powerLimit: series(2000, { 5: 1200 }) }))).toEqual(usedBut({ 5: 'limited' }))
  expect(reasons(input({ powerLimit: series(2000, { 5: 1990 }) }))).toEqual(usedBut({}))
  expect(reasons(input({ powerLimit: series(2000, { 5: NaN }) }))).toEqual(usedBut({}))
  expect(reasons(input({ powerLimit: series(1200), ratedPowerKw: NaN }))).toEqual(usedBut({}))
})

test('a pitch well above the usual one at that wind speed limits', () => {
  expect(reasons(input({ pitch: series(1, { 5: 4 }) }))).toEqual(usedBut({}))
  expect(reasons(input({ pitch: series(1, { 5: 5 }) }))).toEqual(usedBut({ 5: 'limited' }))
  // Near rated power the blades pitch: there the same angle is the usual one.
  const n = 40
  const windSpeed = Float64Array.from({ length: n }, (_, i) => (i < 20 ? 8 : 9))
  const pitch = Float64Array.from({ length: n }, (_, i) => (i < 20 ? 0 : 6))
  const given = input({ windSpeed, pitch }, n)
  expect(new Set(reasons(given))).toEqual(new Set(['used']))
})

test('a limited row is told as limited whatever else sets it aside', () => {
  const given = input({ powerLimit: series(2000, { 5: 1200 }), power: series(900, { 6: 0 }) })
  const { reason, limited, running } = setAsideBeforeCurve(given, SETTINGS)
  expect(named(reason)[5]).toBe('transition')
  expect([...limited]).toEqual([0, 0, 0, 0, 0, 1, 0, 0, 0, 0])
  expect([...running]).toEqual([1, 1, 1, 1, 1, 1, 0, 1, 1, 1])
})

test('a jump of direction or wind speed sets the row after it aside, through north too', () => {
  expect(reasons(input({ windSpeed: Float64Array.from([8, 8, 8, 8, 8, 10.1, 10, 10, 10, 10]) }))).toEqual(
    usedBut({ 5: 'fast-change' }),
  )
  expect(reasons(input({ windSpeed: Float64Array.from([8, 8, 8, 8, 8, 9.9, 10, 10, 10, 10]) }))).toEqual(
    usedBut({}),
  )
  const turned = (by: number) => Float64Array.from({ length: 10 }, (_, i) => (355 + (i < 5 ? 0 : by)) % 360)
  expect(reasons(input({ direction: turned(9) }))).toEqual(usedBut({}))
  expect(reasons(input({ direction: turned(11) }))).toEqual(usedBut({ 5: 'fast-change' }))
})

test('across a gap in time nothing is compared', () => {
  const time = Float64Array.from({ length: 10 }, (_, i) => (i + (i < 5 ? 0 : 3)) * TEN_MINUTES)
  const jump = Float64Array.from({ length: 10 }, (_, i) => (i < 5 ? 8 : 12))
  expect(reasons(input({ time, windSpeed: jump }))).toEqual(usedBut({}))
  // The row before the gap stopped; the one after it is no transition.
  expect(reasons(input({ time, power: series(900, { 4: 0 }) }))).toEqual(
    usedBut({ 3: 'transition', 4: 'not-running' }),
  )
  // Without the row after it, a yaw move cannot be seen from means.
  const nacellePosition = Float64Array.from({ length: 10 }, (_, i) => (i < 4 ? 100 : i === 4 ? 106 : 112))
  expect(reasons(input({ time, nacellePosition }))).toEqual(usedBut({}))
})

test('a row for which several reasons hold keeps the first', () => {
  const all: Partial<SetAsideInput> = {
    windSpeed: series(8, { 5: NaN }),
    excluded: [[5 * TEN_MINUTES, 6 * TEN_MINUTES]],
    power: series(900, { 5: -1 }),
    powerMin: series(400, { 5: -5 }),
    powerLimit: series(2000, { 5: 100 }),
    direction: series(10, { 5: 50 }),
  }
  const without = (...names: (keyof SetAsideInput)[]) =>
    reasons(
      input(Object.fromEntries(Object.entries(all).filter(([name]) => !names.includes(name as never)))),
    )[5]
  expect(without()).toBe('missing-channel')
  expect(without('windSpeed')).toBe('excluded')
  expect(without('windSpeed', 'excluded')).toBe('not-running')
  expect(without('windSpeed', 'excluded', 'power')).toBe('transition')
  expect(without('windSpeed', 'excluded', 'power', 'powerMin')).toBe('limited')
  expect(without('windSpeed', 'excluded', 'power', 'powerMin', 'powerLimit')).toBe('fast-change')
  expect(without('windSpeed', 'excluded', 'power', 'powerMin', 'powerLimit', 'direction')).toBe('used')
})

test('power below the curve alone never sets a row aside', () => {
  const draw = fc.sample(fc.double({ min: 1, max: 2000, noNaN: true }), { numRuns: 50, seed: 1 })
  const power = Float64Array.from(draw)
  expect(new Set(reasons(input({ power }, 50)))).toEqual(new Set(['used']))
})

test('wind speed and vane out of range come last, ends of the range included', () => {
  const speeds = [4.99, 5, 7, 9, 9.01, NaN, 7, 7]
  const vane = Float64Array.from([0, 0, 0, 0, 0, 0, 15, 15.1])
  const reason = new Uint8Array(8)
  reason[2] = REASON_CODE.limited
  setAsideByRange(reason, Float64Array.from(speeds), vane, {
    minMs: 5,
    maxMs: 9,
    vaneMaxDeg: 15,
    isCovered: (speed) => speed !== 9,
  })
  const out = 'outside-wind-range'
  // Used speeds are 5, 7 and 7 with vanes 0, 15 and 15.1: the median is 15, and 0 lies 15 from it.
  expect(named(reason)).toEqual([out, 'used', 'limited', out, out, out, 'used', 'used'])
})

test('the vane is cut about its own median and the short way round', () => {
  const cut = (...vane: number[]): string[] => {
    const reason = new Uint8Array(vane.length)
    setAsideByRange(reason, new Float64Array(vane.length).fill(7), Float64Array.from(vane), {
      minMs: 5,
      maxMs: 9,
      vaneMaxDeg: 15,
      isCovered: () => true,
    })
    return named(reason)
  }
  const expected = ['used', 'used', 'used', 'vane-out-of-range', 'vane-out-of-range']
  expect(cut(10, 11, 12, 30, -10)).toEqual(expected)
  // A vane whose reading is 180 when the rotor faces the wind.
  expect(cut(178, 180, -178, -160, 160)).toEqual(expected)
  expect(cut(176, -176, 170, -170)).toEqual(['used', 'used', 'used', 'used'])
})

test('every row has one reason or is used, and the counts add up', () => {
  const n = 30
  const cell = fc.oneof(fc.double({ min: -50, max: 50, noNaN: true }), fc.constant(NaN))
  const column = fc.array(cell, { minLength: n, maxLength: n }).map((list) => Float64Array.from(list))
  const maybe = fc.option(column, { nil: undefined })
  const words = fc.option(
    fc.array(fc.constantFrom('run', 'stop', 'FULL PERFORMANCE', 'PARTIAL PERFORMANCE', null), {
      minLength: n,
      maxLength: n,
    }),
    { nil: undefined },
  )
  fc.assert(
    fc.property(
      fc.record({
        windSpeed: column,
        vane: column,
        power: column,
        powerMin: maybe,
        powerLimit: maybe,
        pitch: maybe,
        rotorSpeed: maybe,
        nacellePosition: maybe,
        nacelleMin: maybe,
        nacelleMax: maybe,
        direction: maybe,
        status: words,
        availability: words,
      }),
      fc.array(fc.integer({ min: 1, max: 3 }), { minLength: n, maxLength: n }),
      (channels, steps) => {
        let at = 0
        const time = Float64Array.from(steps, (step) => (at += step * TEN_MINUTES))
        const { reason, running, limited } = setAsideBeforeCurve(
          input({ ...channels, time, runningStatus: ['run'] }, n),
          SETTINGS,
        )
        const before = Uint8Array.from(reason)
        setAsideByRange(reason, channels.windSpeed, channels.vane, {
          minMs: 5,
          maxMs: 20,
          vaneMaxDeg: 15,
          isCovered: () => true,
        })
        const counts = countReasons(reason)
        expect(Object.values(counts).reduce((sum, count) => sum + count, 0)).toBe(n)
        for (let i = 0; i < n; i++) {
          if (before[i] !== 0) expect(reason[i]).toBe(before[i])
          const known = [channels.windSpeed, channels.vane, channels.power].every((c) => !Number.isNaN(c[i]!))
          if (reason[i] === 0) expect(known && running[i] === 1 && limited[i] === 0).toBe(true)
          if (running[i] === 1) expect(known && channels.power[i]! > 0).toBe(true)
        }
      },
    ),
  )
})
