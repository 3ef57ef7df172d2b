/** Solves a x = b by Gaussian elimination with row exchange. a: rows of equal length; both are copied. */
export function solve(a: readonly (readonly number[])[], b: readonly number[]): number[] {
  const n = b.length
  const m = a.map((row, i) => [...row, b[i]!])
  for (let k = 0; k < n; k++) {
    let pivot = k
    for (let i = k + 1; i < n; i++) if (Math.abs(m[i]![k]!) > Math.abs(m[pivot]![k]!)) pivot = i
    ;[m[k], m[pivot]] = [m[pivot]!, m[k]!]
    for (let i = k + 1; i < n; i++) {
      const factor = m[i]![k]! / m[k]![k]!
      for (let j = k; j <= n; j++) m[i]![j]! -= factor * m[k]![j]!
    }
  }
  const x = new Array<number>(n).fill(0)
  for (let i = n - 1; i >= 0; i--) {
    let rest = m[i]![n]!
    for (let j = i + 1; j < n; j++) rest -= m[i]![j]! * x[j]!
    x[i] = rest / m[i]![i]!
  }
  return x
}

/** Weighted least squares by the normal equations. design: one row of regressors per observation. */
export function leastSquares(
  design: readonly (readonly number[])[],
  y: readonly number[],
  weight: readonly number[],
): number[] {
  const k = design[0]!.length
  const normal = Array.from({ length: k }, () => new Array<number>(k).fill(0))
  const right = new Array<number>(k).fill(0)
  design.forEach((row, i) => {
    for (let a = 0; a < k; a++) {
      right[a]! += weight[i]! * row[a]! * y[i]!
      for (let b = 0; b < k; b++) normal[a]![b]! += weight[i]! * row[a]! * row[b]!
    }
  })
  return solve(normal, right)
}

/** Lower triangle L with L L' = matrix. */
export function cholesky(matrix: readonly (readonly number[])[]): number[][] {
  const n = matrix.length
  const lower = Array.from({ length: n }, () => new Array<number>(n).fill(0))
  for (let i = 0; i < n; i++) {
    for (let j = 0; j <= i; j++) {
      let sum = matrix[i]![j]!
      for (let k = 0; k < j; k++) sum -= lower[i]![k]! * lower[j]![k]!
      lower[i]![j] = i === j ? Math.sqrt(sum) : sum / lower[j]![j]!
    }
  }
  return lower
}

/** x with L x = b. */
export function forward(lower: readonly (readonly number[])[], b: ArrayLike<number>): number[] {
  const x: number[] = []
  for (let i = 0; i < lower.length; i++) {
    let rest = b[i]!
    for (let j = 0; j < i; j++) rest -= lower[i]![j]! * x[j]!
    x.push(rest / lower[i]![i]!)
  }
  return x
}
