import fc from 'fast-check'
import { expect, test } from 'vitest'
import { yawMoves } from '../../../src/kernel/motion/index.ts'
import { normals } from '../stats/normals.ts'

interface Ramp {
  atS: number
  travelDeg: number
}

const RATE_DEG_S = 0.4

/** A nacelle that rests but for ramps of 0.4 degrees per second; true heading at each sample. */
function headings(seconds: number, sampleS: number, ramps: readonly Ramp[], from = 100) {
  const n = Math.round(seconds / sampleS)
  const time = Float64Array.from({ length: n }, (_, i) => i * sampleS)
  const heading = time.map((at) =>
    ramps.reduce((sum, { atS, travelDeg }) => {
      const turned = Math.max(0, Math.min(Math.abs(travelDeg), (at - atS) * RATE_DEG_S))
      return sum + Math.sign(travelDeg) * turned
    }, from),
  )
  return { time, heading }
}

const RAMPS: readonly Ramp[] = [
  { atS: 300, travelDeg: 8 },
  { atS: 900, travelDeg: -12 },
  { atS: 1500, travelDeg: 3 },
]

test('moves of a fine reading are found with start, stop, travel and rate', () => {
  const { time, heading } = headings(2000, 1, RAMPS)
  const moves = yawMoves(time, heading)
  expect(moves.start.length).toBe(3)
  RAMPS.forEach(({ atS, travelDeg }, k) => {
    // By hand: the ramp leaves the level after atS and ends |travel| / 0.4 s later; one sample of play on either side.
    expect(Math.abs(moves.start[k]! - atS)).toBeLessThanOrEqual(1)
    expect(Math.abs(moves.stop[k]! - atS - Math.abs(travelDeg) / RATE_DEG_S)).toBeLessThanOrEqual(1)
    // A ramp of 0.4 degrees a sample cannot be told from a reading in steps of 0.4.
    expect(Math.abs(moves.travelDeg[k]! - travelDeg)).toBeLessThan(0.4)
    expect(Math.abs(moves.rateDegS[k]! - RATE_DEG_S)).toBeLessThan(0.06)
  })
})

test('a reading in steps of 0.1 to 1 degree shows the same moves, to one step', () => {
  const { time, heading } = headings(2000, 1, RAMPS, 99.87)
  for (const stepDeg of [0.1, 0.25, 0.5, 1]) {
    const quantised = heading.map((value) => Math.round(value / stepDeg) * stepDeg)
    const moves = yawMoves(time, quantised)
    expect(moves.start.length, `step ${stepDeg}`).toBe(3)
    RAMPS.forEach(({ atS, travelDeg }, k) => {
      expect(Math.abs(moves.travelDeg[k]! - travelDeg), `step ${stepDeg}`).toBeLessThanOrEqual(stepDeg + 1e-9)
      expect(Math.abs(moves.start[k]! - atS)).toBeLessThanOrEqual(2 + stepDeg / RATE_DEG_S)
    })
  }
})

test('noise, and flicker between two codes, are no moves', () => {
  const draw = normals(3)
  const { time, heading } = headings(20_000, 1, RAMPS, 100.5)
  for (const [noiseDeg, stepDeg] of [
    [0.1, 0],
    [0.3, 0],
    [0.05, 0.1],
    [0.15, 1],
  ] as const) {
    const read = heading.map((value) => {
      const noisy = value + noiseDeg * draw()
      return stepDeg > 0 ? Math.round(noisy / stepDeg) * stepDeg : noisy
    })
    const moves = yawMoves(time, read)
    expect(moves.start.length, `noise ${noiseDeg}, step ${stepDeg}`).toBe(3)
    RAMPS.forEach(({ travelDeg }, k) => {
      // Five samples on either side are averaged: 4 SD of the difference, and one step of the reading.
      const play = 4 * noiseDeg * Math.sqrt(2 / 3) + stepDeg + 1e-9
      expect(Math.abs(moves.travelDeg[k]! - travelDeg)).toBeLessThan(play)
    })
  }
})

test('the seam of a wrapped or signed scale is no move, and travel runs across it', () => {
  const { time, heading } = headings(2000, 1, RAMPS, 355)
  const wound = yawMoves(time, heading)
  for (const read of [
    heading.map((value) => ((value % 360) + 360) % 360),
    heading.map((value) => ((((value + 180) % 360) + 360) % 360) - 180),
  ]) {
    const moves = yawMoves(time, read)
    expect([...moves.start]).toEqual([...wound.start])
    expect([...moves.stop]).toEqual([...wound.stop])
    moves.travelDeg.forEach((travel, k) => {
      expect(travel).toBeCloseTo(wound.travelDeg[k]!, 9)
    })
  }
})

test('rates from 0.1 to 20 Hz give the same moves', () => {
  for (const sampleS of [0.05, 0.1, 0.5, 2, 5, 10]) {
    const { time, heading } = headings(2000, sampleS, RAMPS)
    const moves = yawMoves(time, heading)
    expect(moves.start.length, `${sampleS} s`).toBe(3)
    RAMPS.forEach(({ atS, travelDeg }, k) => {
      expect(Math.abs(moves.travelDeg[k]! - travelDeg), `${sampleS} s`).toBeLessThan(
        Math.min(1, RATE_DEG_S * sampleS) + 1e-9,
      )
      expect(Math.abs(time[moves.start[k]!]! - atS)).toBeLessThanOrEqual(sampleS + 1e-9)
    })
  }
})

test('a drifting sensor does not move, and a slow pointer is no yaw', () => {
  const time = Float64Array.from({ length: 86_400 }, (_, i) => i)
  const drift = time.map((at) => 20 + (5 * at) / 86_400)
  expect(yawMoves(time, drift).start.length).toBe(0)
})

test('missing readings inside a move do no harm; a long gap ends it unseen', () => {
  const { time, heading } = headings(2000, 1, RAMPS)
  const holed = heading.map((value, i) => (i % 7 === 3 || (i > 312 && i < 318) ? NaN : value))
  expect(Array.from(yawMoves(time, holed).travelDeg, (x) => Math.round(x))).toEqual([8, -12, 3])
  const gapped = heading.map((value, i) => (i > 905 && i < 925 ? NaN : value))
  expect(Array.from(yawMoves(time, gapped).travelDeg, (x) => Math.round(x))).toEqual([8, 3])
})

test('turning the sense of the reading turns the sense of the moves, whatever the moves are', () => {
  fc.assert(
    fc.property(fc.array(fc.integer({ min: -30, max: 30 }), { minLength: 1, maxLength: 6 }), (travels) => {
      const ramps = travels.map((travelDeg, k) => ({ atS: 200 + 400 * k, travelDeg }))
      const { time, heading } = headings(400 * travels.length + 400, 1, ramps)
      const moves = yawMoves(time, heading, { leastTravelDeg: 1.5 })
      const mirrored = yawMoves(
        time,
        heading.map((value) => -value),
        { leastTravelDeg: 1.5 },
      )
      const wanted = travels.filter((travel) => Math.abs(travel) >= 2)
      expect(Array.from(moves.travelDeg, (x) => Math.round(x))).toEqual(wanted)
      expect(Array.from(mirrored.travelDeg, (x) => Math.round(-x) + 0)).toEqual(wanted.map((x) => x + 0))
    }),
    { numRuns: 40, seed: 5 },
  )
})

test('an empty series has no moves, and lengths must match', () => {
  expect(yawMoves(new Float64Array(0), new Float64Array(0)).start.length).toBe(0)
  expect(() => yawMoves(new Float64Array(2), new Float64Array(3))).toThrow(
    expect.objectContaining({ code: 'LENGTH_MISMATCH' }),
  )
  expect(() => yawMoves(new Float64Array(2), new Float64Array(2), { leastTravelDeg: NaN })).toThrow(
    expect.objectContaining({ code: 'OUT_OF_RANGE' }),
  )
})
