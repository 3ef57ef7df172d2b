import { expect, test } from 'vitest'
import { codesVisited, frozenRuns, resolutionOf } from '../../../src/kernel/motion/index.ts'

test('runs of one value are found with first sample and length, missing samples inside included', () => {
  const values = Float64Array.of(1, 2, 2, NaN, 2, 3, 3, NaN, 4)
  // By hand: 2 from index 1 to 4, 3 from 5 to 6; the missing sample after it belongs to no run.
  const runs = frozenRuns(values, 2)
  expect([...runs.start]).toEqual([1, 5])
  expect([...runs.length]).toEqual([4, 2])
  expect([...frozenRuns(values, 3).start]).toEqual([1])
})

test('a tolerance is counted from the first value of a run, so that a creeping series is not frozen', () => {
  const creeping = Float64Array.from({ length: 100 }, (_, i) => 0.01 * i)
  expect([...frozenRuns(creeping, 5, 0.025).length]).toEqual([])
  expect(Math.max(...frozenRuns(creeping, 2, 0.025).length)).toBe(3)
})

test('a run that lasts to the end counts, and a series without values has none', () => {
  expect([...frozenRuns(Float64Array.of(5, 1, 1, 1), 3).length]).toEqual([3])
  expect(frozenRuns(new Float64Array(9).fill(NaN), 2).start.length).toBe(0)
})

test('runs need a length of two and a tolerance that is no less than 0', () => {
  expect(() => frozenRuns(new Float64Array(3), 1)).toThrow(expect.objectContaining({ code: 'OUT_OF_RANGE' }))
  expect(() => frozenRuns(new Float64Array(3), NaN)).toThrow(
    expect.objectContaining({ code: 'OUT_OF_RANGE' }),
  )
  expect(() => frozenRuns(new Float64Array(3), 2, -1)).toThrow(
    expect.objectContaining({ code: 'OUT_OF_RANGE' }),
  )
})

test('each code is listed once with its count, rounding apart', () => {
  const visited = codesVisited(Float64Array.of(5.625, 0, NaN, 5.625 + 1e-13, 354.375, 0))
  expect(visited.codes.length).toBe(3)
  expect(visited.codes[1]).toBeCloseTo(5.625, 9)
  expect([...visited.counts]).toEqual([2, 2, 1])
  expect(visited.samples).toBe(5)
  expect(codesVisited(Float64Array.of(NaN)).codes.length).toBe(0)
})

test('step, noise and sampling are read from the series', () => {
  const n = 4000
  const time = Float64Array.from({ length: n }, (_, i) => 0.5 * i)
  // Eleven steps of half a degree among readings that stand still, one of them across north.
  const angle = time.map((_, i) => (357 + 0.5 * Math.floor(i / 350)) % 360)
  const { stepDeg, noiseDeg, sampleS } = resolutionOf(time, angle)
  expect(stepDeg).toBeCloseTo(0.5, 9)
  expect(noiseDeg).toBe(0)
  expect(sampleS).toBe(0.5)
})
