import { medianOf, robustSd, studentQuantile } from '../../kernel/stats/index.ts'

/** Values further than this from their cell's level, in robust SDs, count as that far. */
const CLIP = 4
const ROUNDS = 3
/** Blocks on the thinner side below which their spread says nothing. */
const MIN_BLOCKS = 4

export interface StepQuestion {
  /** One value each interval; NaN = missing. Length n. */
  readonly value: Float64Array
  /** Cell of like conditions (sector, wind speed), 0 ... cells - 1; -1: not compared. Length n. */
  readonly cell: Int32Array
  readonly cells: number
  /** -1 before, 1 after, 0 neither. Length n. */
  readonly side: Int8Array
  /** Lengths of the blocks that are taken as independent, in intervals. */
  readonly blocks: readonly number[]
}

export interface Step {
  /** After less before, cells with rows on both sides weighted by what they tell; NaN where none has. */
  readonly step: number
  /** At 95 %, from the spread of blocks, t quantile; the widest block length counts. NaN with too few blocks. */
  readonly halfWidth: number
  readonly rowsBefore: number
  readonly rowsAfter: number
  /** Share of the rows after whose cell was seen before. */
  readonly seenShare: number
}

/**
 * By how much a series steps from before to after among rows in like conditions: the coefficient of "after" beside a
 * level for each cell, with far values drawn in.
 */
export function stepWithinCells(question: StepQuestion): Step {
  const { cell, cells, side } = question
  const n = cell.length
  const rows: number[] = []
  let allAfter = 0
  const count = new Float64Array(2 * cells)
  for (let t = 0; t < n; t++) {
    if (side[t] === 0 || cell[t]! < 0 || Number.isNaN(question.value[t]!)) continue
    count[2 * cell[t]! + (side[t]! > 0 ? 1 : 0)]!++
    if (side[t]! > 0) allAfter++
    rows.push(t)
  }
  const weight = new Float64Array(cells)
  let total = 0
  for (let c = 0; c < cells; c++) {
    const before = count[2 * c]!
    const after = count[2 * c + 1]!
    weight[c] = before > 0 && after > 0 ? (before * after) / (before + after) : 0
    total += weight[c]!
  }
  const compared = rows.filter((t) => weight[cell[t]!]! > 0)
  const rowsAfter = compared.reduce((sum, t) => sum + (side[t]! > 0 ? 1 : 0), 0)
  const counts = {
    rowsBefore: compared.length - rowsAfter,
    rowsAfter,
    seenShare: allAfter > 0 ? rowsAfter / allAfter : 0,
  }
  if (!(total > 0)) return { step: NaN, halfWidth: NaN, ...counts }

  const value = drawnIn(compared, question)
  const residual = new Float64Array(compared.length)
  let step = 0
  for (let round = 0; round < ROUNDS; round++) {
    const sum = new Float64Array(2 * cells)
    compared.forEach((t, k) => (sum[2 * cell[t]! + (side[t]! > 0 ? 1 : 0)]! += value[k]!))
    step = 0
    for (let c = 0; c < cells; c++) {
      if (weight[c]! > 0) {
        step += (weight[c]! / total) * (sum[2 * c + 1]! / count[2 * c + 1]! - sum[2 * c]! / count[2 * c]!)
      }
    }
    const levelOf = (t: number): number => {
      const c = cell[t]!
      const both = count[2 * c]! + count[2 * c + 1]!
      const level = (sum[2 * c]! + sum[2 * c + 1]! - step * count[2 * c + 1]!) / both
      return level + (side[t]! > 0 ? step : 0)
    }
    compared.forEach((t, k) => (residual[k] = question.value[t]! - levelOf(t)))
    const reach = CLIP * robustSd(residual)
    if (!(reach > 0)) break
    compared.forEach((t, k) => {
      const drawn = Math.max(-reach, Math.min(reach, residual[k]!))
      value[k] = question.value[t]! - residual[k]! + drawn
      residual[k] = drawn
    })
  }

  let halfWidth = NaN
  for (const length of question.blocks) {
    const sums = new Map<number, number>()
    const of = { before: new Set<number>(), after: new Set<number>() }
    compared.forEach((t, k) => {
      const c = cell[t]!
      const isAfter = side[t]! > 0
      const share = weight[c]! / total / count[2 * c + (isAfter ? 1 : 0)]!
      const block = 2 * Math.floor(t / length) + (isAfter ? 1 : 0)
      of[isAfter ? 'after' : 'before'].add(block)
      sums.set(block, (sums.get(block) ?? 0) + (isAfter ? share : -share) * residual[k]!)
    })
    const fewest = Math.min(of.before.size, of.after.size)
    if (fewest < MIN_BLOCKS) continue
    let squares = 0
    for (const sum of sums.values()) squares += sum * sum
    const half = studentQuantile(0.975, fewest - 1) * Math.sqrt((squares * fewest) / (fewest - 1))
    if (!(halfWidth >= half)) halfWidth = half
  }
  return { step, halfWidth, ...counts }
}

/** Values drawn in towards the median of their cell: means of values as they are would follow a single far one. */
function drawnIn(rows: readonly number[], { value, cell, cells }: StepQuestion): Float64Array {
  const byCell = Array.from({ length: cells }, (): number[] => [])
  for (const t of rows) byCell[cell[t]!]!.push(value[t]!)
  const centre = byCell.map((values) => medianOf(values))
  const off = Float64Array.from(rows, (t) => value[t]! - centre[cell[t]!]!)
  const reach = CLIP * robustSd(off)
  return Float64Array.from(rows, (t, k) =>
    reach > 0 ? centre[cell[t]!]! + Math.max(-reach, Math.min(reach, off[k]!)) : value[t]!,
  )
}
