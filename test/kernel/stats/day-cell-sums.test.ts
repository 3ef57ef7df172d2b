import fc from 'fast-check'
import { expect, test } from 'vitest'
import {
  cellLevels,
  dayCells,
  dayCellSums,
  dayWeights,
  groupSlopes,
  resampledSlopes,
  slopeWithinCells,
} from '../../../src/kernel/stats/index.ts'
import { leastSquares } from './dense.ts'
import { normals } from './normals.ts'

interface Rows {
  days: number
  cells: number
  day: number[]
  cell: number[]
  x: number[]
  y: number[]
  weight: number[]
}

function madeUp(seed: number, n = 120, days = 7, cells = 4): Rows {
  const draw = normals(seed)
  const rows: Rows = { days, cells, day: [], cell: [], x: [], y: [], weight: [] }
  for (let i = 0; i < n; i++) {
    const day = Math.floor((i * days) / n)
    const cell = Math.floor(Math.abs(draw()) * 10) % cells
    const x = draw() + cell
    rows.day.push(day)
    rows.cell.push(cell)
    rows.x.push(x)
    rows.y.push(0.7 * x + 3 * cell + draw())
    rows.weight.push(i % 11 === 0 ? 0 : 0.2 + Math.abs(draw()))
  }
  return rows
}

const sumsOf = (rows: Rows) =>
  dayCellSums(
    dayCells(rows.day, rows.cell, rows),
    Float64Array.from(rows.x),
    Float64Array.from(rows.y),
    Float64Array.from(rows.weight),
  )

/** Slope and levels of the regression on x and one dummy per cell that has weight. */
function dense(rows: Rows, times: (day: number) => number = () => 1) {
  const weight = rows.weight.map((w, i) => w * times(rows.day[i]!))
  const present = [...new Set(rows.cell.filter((_, i) => weight[i]! > 0))].sort((a, b) => a - b)
  const design = rows.x.map((x, i) => [x, ...present.map((cell) => (rows.cell[i] === cell ? 1 : 0))])
  const [slope, ...levels] = leastSquares(design, rows.y, weight)
  return { slope: slope!, levels: new Map(present.map((cell, k) => [cell, levels[k]!])) }
}

test('slope and levels are those of least squares with a dummy for each cell', () => {
  for (let seed = 1; seed <= 20; seed++) {
    const rows = madeUp(seed)
    const sums = sumsOf(rows)
    const expected = dense(rows)
    const slope = slopeWithinCells(sums)
    expect(Math.abs(slope - expected.slope), `seed ${seed}`).toBeLessThan(1e-10)
    const levels = cellLevels(sums, slope)
    for (const [cell, level] of expected.levels) expect(Math.abs(levels[cell]! - level)).toBeLessThan(1e-9)
  }
})

test('slopes of groups are those of the rows of their cells alone, in every resample too', () => {
  const rows = madeUp(5)
  const weights = dayWeights({ days: rows.days, blockDays: 2, resamples: 30, seed: 3 })
  const groups = [[0, 2], [1], [0, 1, 2, 3], []]
  const answers = groupSlopes(sumsOf(rows), groups, weights)
  groups.slice(0, 3).forEach((cells, g) => {
    const own = sumsOf({
      ...rows,
      weight: rows.weight.map((w, i) => (cells.includes(rows.cell[i]!) ? w : 0)),
    })
    expect(Math.abs(answers[g]!.slope - slopeWithinCells(own))).toBeLessThan(1e-12)
    resampledSlopes(own, weights).forEach((slope, r) => {
      const got = answers[g]!.resampled[r]!
      if (Number.isNaN(slope)) expect(got).toBe(NaN)
      else expect(Math.abs(got - slope)).toBeLessThan(1e-12)
    })
  })
  expect(answers[3]!.slope).toBe(NaN)
  const other = dayWeights({ days: 3, blockDays: 1, resamples: 5, seed: 1 })
  expect(() => groupSlopes(sumsOf(rows), groups, other)).toThrow(
    expect.objectContaining({ code: 'LENGTH_MISMATCH' }) as Error,
  )
})

test('a resampled slope is the slope of the rows repeated as often as their day was drawn', () => {
  for (const blockDays of [1, 3]) {
    const rows = madeUp(77)
    const weights = dayWeights({ days: rows.days, blockDays, resamples: 40, seed: 6 })
    const slopes = resampledSlopes(sumsOf(rows), weights)
    for (let r = 0; r < 40; r++) {
      const repeated: Rows = { ...rows, day: [], cell: [], x: [], y: [], weight: [] }
      rows.x.forEach((x, i) => {
        for (let k = 0; k < weights.counts[r * rows.days + rows.day[i]!]!; k++) {
          repeated.day.push(rows.day[i]!)
          repeated.cell.push(rows.cell[i]!)
          repeated.x.push(x)
          repeated.y.push(rows.y[i]!)
          repeated.weight.push(rows.weight[i]!)
        }
      })
      expect(Math.abs(slopes[r]! - dense(repeated).slope), `resample ${r}`).toBeLessThan(1e-9)
    }
  }
})

test('a level added to every row of a cell changes no slope', () => {
  fc.assert(
    fc.property(
      fc.integer({ min: 0, max: 1e6 }),
      fc.array(fc.double({ min: -50, max: 50, noNaN: true }), { minLength: 4, maxLength: 4 }),
      (seed, added) => {
        const rows = madeUp(seed)
        const lifted = { ...rows, y: rows.y.map((y, i) => y + added[rows.cell[i]!]!) }
        expect(Math.abs(slopeWithinCells(sumsOf(lifted)) - slopeWithinCells(sumsOf(rows)))).toBeLessThan(1e-9)
      },
    ),
    { numRuns: 50 },
  )
})

test('without variation of x inside any cell there is no slope', () => {
  const rows = madeUp(5)
  const flat = { ...rows, x: rows.cell.map((cell) => cell * 2) }
  expect(slopeWithinCells(sumsOf(flat))).toBeNaN()
  const weights = dayWeights({ days: rows.days, blockDays: 1, resamples: 200, seed: 1 })
  expect(resampledSlopes(sumsOf(flat), weights).every((slope) => Number.isNaN(slope))).toBe(true)
  expect(slopeWithinCells(sumsOf({ ...rows, weight: rows.weight.map(() => 0) }))).toBeNaN()
})

test('days and cells without rows are no matter', () => {
  const rows = madeUp(9)
  const wide = {
    ...rows,
    days: 40,
    cells: 9,
    day: rows.day.map((day) => day * 5),
    cell: rows.cell.map((c) => c + 3),
  }
  expect(slopeWithinCells(sumsOf(wide))).toBeCloseTo(slopeWithinCells(sumsOf(rows)), 12)
  expect(cellLevels(sumsOf(wide), 1)[0]).toBe(0)
})

test('places outside the window and series of another length have their error codes', () => {
  const size = { days: 3, cells: 2 }
  const range: unknown = expect.objectContaining({ code: 'OUT_OF_RANGE' })
  const mismatch: unknown = expect.objectContaining({ code: 'LENGTH_MISMATCH' })
  expect(() => dayCells([0, 3], [0, 0], size)).toThrow(range)
  expect(() => dayCells([0, -1], [0, 0], size)).toThrow(range)
  expect(() => dayCells([0, NaN], [0, 0], size)).toThrow(range)
  expect(() => dayCells([0, 0], [0, 2], size)).toThrow(range)
  expect(() => dayCells([0, 0], [0], size)).toThrow(mismatch)
  const layout = dayCells([0, 1], [0, 1], size)
  const two = new Float64Array(2)
  const three = new Float64Array(3)
  expect(() => dayCellSums(layout, three, two, two)).toThrow(mismatch)
  expect(() => dayCellSums(layout, two, three, two)).toThrow(mismatch)
  expect(() => dayCellSums(layout, two, two, three)).toThrow(mismatch)
  const sums = dayCellSums(layout, two, two, two)
  const other = dayWeights({ days: 4, blockDays: 1, resamples: 200, seed: 1 })
  expect(() => resampledSlopes(sums, other)).toThrow(mismatch)
})
