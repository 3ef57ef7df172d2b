import { expect, test } from 'vitest'
import { stepWithinCells } from '../../../src/analysis/proof/step-within-cells.ts'
import { normals } from '../../kernel/stats/normals.ts'

const N = 4000

function series(step: number, noise: number, seed = 1) {
  const draw = normals(seed)
  const value = new Float64Array(N)
  const cell = new Int32Array(N)
  const side = new Int8Array(N)
  for (let t = 0; t < N; t++) {
    // Cells are visited in spells that differ before and after, and have levels of their own.
    side[t] = t < 2500 ? -1 : 1
    cell[t] = Math.floor(t / 60 + (side[t]! > 0 ? 2 : 0)) % 5
    value[t] = 10 * cell[t]! + (side[t]! > 0 ? step : 0) + noise * draw()
  }
  return { value, cell, cells: 5, side, blocks: [1, 50] }
}

test('levels of cells cancel: without noise the step is exact, however the cells are visited', () => {
  const { step, seenShare } = stepWithinCells(series(0.37, 0))
  expect(step).toBeCloseTo(0.37, 12)
  expect(seenShare).toBe(1)
})

test('the interval holds the step in about 95 of 100 series', () => {
  let held = 0
  for (let seed = 1; seed <= 300; seed++) {
    const { step, halfWidth } = stepWithinCells(series(0.2, 1, seed))
    if (Math.abs(step - 0.2) <= halfWidth) held++
  }
  // The wider of two block lengths counts: 95 % at least, less three SDs of chance in 300 (1.3 % each).
  expect(held / 300).toBeGreaterThan(0.91)
})

test('missing values and rows outside both sides are left out, and a far value hardly moves the step', () => {
  const made = series(0.5, 0.1)
  const usual = stepWithinCells(made).step
  made.value[3000] = 1e6
  made.value[3001] = NaN
  made.side[3002] = 0
  const moved = stepWithinCells(made)
  expect(moved.rowsAfter).toBe(N - 2500 - 2)
  expect(Math.abs(moved.step - usual)).toBeLessThan(0.01)
})

test('without a cell that was seen on both sides there is no step', () => {
  const made = series(1, 0)
  const cell = made.cell.map((c, t) => (made.side[t]! > 0 ? c + 5 : c))
  const answer = stepWithinCells({ ...made, cell, cells: 10 })
  expect(answer.step).toBeNaN()
  expect(answer.seenShare).toBe(0)
})
