import { expect, test } from 'vitest'
import { captureMatrix, powerAgainstVane } from '../../../src/analysis/offset/power-against-vane-table.ts'
import { frameOf, syntheticColumns } from '../synthetic.ts'

const { frame } = frameOf(syntheticColumns({ days: 10, offsetDeg: 6, noise: 0.02 }))

test('every used row lies in one entry, at its own wind speed and vane', () => {
  const table = powerAgainstVane(frame)
  const used = [...frame.time.keys()].filter((i) => frame.reason[i] === 0)
  expect(table.rows.reduce((sum, count) => sum + count, 0)).toBe(used.length)
  // By hand: one entry counted the slow way.
  const s = 2
  const v = table.vaneBins >> 1
  const from = table.vaneFromDeg + 2 * v
  const inside = used.filter(
    (i) =>
      Math.floor(frame.normalisedSpeed[i]!) === table.speedFromMs + s &&
      frame.vane[i]! >= from &&
      frame.vane[i]! < from + 2,
  )
  expect(inside.length).toBeGreaterThan(5)
  expect(table.rows[s * table.vaneBins + v]).toBe(inside.length)
})

test('the power of a rotor that stands off falls from one side of the vane to the other at every wind speed', () => {
  const table = powerAgainstVane(frame)
  for (let s = 0; s < table.speedBins; s++) {
    const at = (vaneDeg: number): number =>
      s * table.vaneBins + Math.floor((vaneDeg - table.vaneFromDeg) / table.vaneWidthDeg)
    const [left, right] = [at(-6), at(6)]
    if (!(table.rows[left]! >= 8 && table.rows[right]! >= 8)) continue
    // cos(12)^3 over cos(0)^3 is 0.936 where d = 6; the scatter of 8 rows is 0.02 / sqrt(8).
    expect(table.relativePowerMean[right]! / table.relativePowerMean[left]!).toBeLessThan(0.97)
    expect(table.relativePowerSd[left]).toBeLessThan(0.06)
  }
})

test('the capture matrix counts all running rows, and empty entries are empty', () => {
  const matrix = captureMatrix(frame)
  const running = frame.running.reduce((sum, runs) => sum + runs, 0)
  expect(matrix.rows.reduce((sum, count) => sum + count, 0)).toBe(running)
  expect(matrix.rows.length).toBe(matrix.speedBins * matrix.vaneBins)
  const table = powerAgainstVane(frame)
  table.rows.forEach((count, entry) => {
    expect(Number.isNaN(table.relativePowerMean[entry]!)).toBe(count === 0)
    expect(Number.isNaN(table.relativePowerSd[entry]!)).toBe(count < 2)
  })
})

test('a turbine that never runs has an empty matrix', () => {
  const still = { ...frame, running: new Uint8Array(frame.time.length) }
  expect(captureMatrix(still)).toMatchObject({ speedBins: 0, vaneBins: 0, rows: [] })
})
