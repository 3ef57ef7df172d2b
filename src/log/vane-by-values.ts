/** Share of producing rows within 60 degrees of zero from which a signed direction is a vane. */
const NEAR_SHARE = 0.9
const LARGEST_MEAN_DEG = 20
const FEWEST_ROWS = 20

/**
 * Whether a column of directions holds a vane, whatever its name: a signed direction that stays near zero while the turbine
 * produces is measured against the nacelle; a direction against north is spread over the circle, or never negative.
 *
 * @param cells  directions of the beginning as text, degrees.
 * @param power  power of the same rows as text; null when there is no such column: then all rows count.
 */
export function isVaneByValues(cells: readonly string[], power: readonly string[] | null): boolean {
  let rows = 0
  let near = 0
  let negative = 0
  let sum = 0
  cells.forEach((cell, i) => {
    const value = number(cell)
    if (Number.isNaN(value) || Math.abs(value) > 180) return
    if (power !== null && !(number(power[i] ?? '') > 0)) return
    rows++
    sum += value
    if (value < 0) negative++
    if (Math.abs(value) < 60) near++
  })
  return (
    rows >= FEWEST_ROWS &&
    near >= NEAR_SHARE * rows &&
    negative >= 0.05 * rows &&
    Math.abs(sum / rows) < LARGEST_MEAN_DEG
  )
}

const number = (cell: string) => (cell.trim() === '' ? NaN : Number(cell.replace(',', '.')))
