import { expect, test } from 'vitest'
import { serialNoise, whiten, type RowPlaces, type SerialNoise } from '../../../src/kernel/stats/index.ts'
import { cholesky, forward, leastSquares, solve } from './dense.ts'
import { normals } from './normals.ts'

/** Rows with gaps: some intervals are missing, and a chain ends every `chainLength` intervals. */
function placesWithGaps(
  intervals: number,
  chainLength: number,
  seed: number,
): { position: number[]; chain: number[] } {
  const draw = normals(seed)
  const position: number[] = []
  const chain: number[] = []
  for (let i = 0; i < intervals; i++) {
    if (Math.abs(draw()) > 1.3) continue // about a fifth is missing
    position.push(i)
    chain.push(Math.floor(i / chainLength))
  }
  return { position, chain }
}

/** A slow part that forgets exponentially within each chain, and a part that is new in each row; total variance 1. */
function simulate(places: RowPlaces, noise: SerialNoise, seed: number): Float64Array {
  const draw = normals(seed)
  let slow = 0
  return Float64Array.from({ length: places.position.length }, (_, i) => {
    const fresh = i === 0 || places.chain[i] !== places.chain[i - 1]
    const kept = fresh ? 0 : noise.persistence ** (places.position[i]! - places.position[i - 1]!)
    slow = kept * slow + Math.sqrt(noise.share * (1 - kept * kept)) * draw()
    return slow + Math.sqrt(1 - noise.share) * draw()
  })
}

function covariance(places: RowPlaces, noise: SerialNoise): number[][] {
  const n = places.position.length
  return Array.from({ length: n }, (_, i) =>
    Array.from({ length: n }, (_, j) => {
      if (i === j) return 1
      if (places.chain[i] !== places.chain[j]) return 0
      return noise.share * noise.persistence ** Math.abs(places.position[i]! - places.position[j]!)
    }),
  )
}

function autocorrelation(
  values: Float64Array,
  places: RowPlaces,
  lag: number,
): { value: number; pairs: number } {
  const at = new Map(Array.from(places.position, (position, i) => [`${places.chain[i]!} ${position}`, i]))
  let sum = 0
  let pairs = 0
  let squares = 0
  for (let i = 0; i < values.length; i++) {
    squares += values[i]! ** 2
    const before = at.get(`${places.chain[i]!} ${places.position[i]! - lag}`)
    if (before === undefined) continue
    sum += values[i]! * values[before]!
    pairs++
  }
  return { value: sum / pairs / (squares / values.length), pairs }
}

test('share and persistence of simulated noise are recovered, gaps and all', () => {
  for (const noise of [
    { share: 0.6, persistence: 0.8 },
    { share: 0.9, persistence: 0.5 },
    { share: 0.3, persistence: 0.9 },
  ]) {
    const places = placesWithGaps(60_000, 144, 3)
    const found = serialNoise(simulate(places, noise, 4), places)
    // The lag-1 autocorrelation of 38,000 pairs has an SD near 0.01; share and persistence are read off a grid of 0.05.
    expect(Math.abs(found.persistence - noise.persistence), JSON.stringify(found)).toBeLessThan(0.06)
    expect(Math.abs(found.share - noise.share), JSON.stringify(found)).toBeLessThan(0.07)
    expect(
      Math.abs(found.share * found.persistence - noise.share * noise.persistence),
      JSON.stringify(found),
    ).toBeLessThan(0.03)
  }
})

test('noise without memory, and too few rows, have share 0', () => {
  const places = placesWithGaps(3000, 144, 8)
  // White noise: the threshold of two standard errors lets a chance autocorrelation through in a fortieth of cases, and then a small one.
  let found = 0
  for (let seed = 1; seed <= 40; seed++) {
    const { share, persistence } = serialNoise(simulate(places, { share: 0, persistence: 0 }, seed), places)
    if (share > 0) found++
    expect(share * persistence).toBeLessThan(0.1)
  }
  expect(found).toBeLessThanOrEqual(5)
  const few = placesWithGaps(50, 144, 8)
  expect(serialNoise(simulate(few, { share: 0.9, persistence: 0.9 }, 1), few).share).toBe(0)
  expect(
    serialNoise(new Float64Array(500), { position: [...Array(500).keys()], chain: new Uint8Array(500) })
      .share,
  ).toBe(0)
  expect(serialNoise(new Float64Array(0), { position: [], chain: [] }).share).toBe(0)
})

test('an alternating residual has no memory of this kind', () => {
  const position = [...Array(500).keys()]
  const residual = Float64Array.from(position, (i) => (i % 2 === 0 ? 1 : -1))
  expect(serialNoise(residual, { position, chain: new Uint8Array(500) }).share).toBe(0)
})

test('whitened noise has variance 1 and no autocorrelation', () => {
  const noise = { share: 0.7, persistence: 0.85 }
  const places = placesWithGaps(40_000, 144, 12)
  const raw = simulate(places, noise, 13)
  expect(autocorrelation(raw, places, 1).value).toBeGreaterThan(0.5)
  const [white] = whiten([raw], places, noise) as [Float64Array]
  for (const lag of [1, 2, 3, 6]) {
    const { value, pairs } = autocorrelation(white, places, lag)
    expect(Math.abs(value), `lag ${lag}`).toBeLessThan(4 / Math.sqrt(pairs))
  }
  const variance = white.reduce((sum, value) => sum + value * value, 0) / white.length
  expect(Math.abs(variance - 1)).toBeLessThan(4 * Math.sqrt(2 / white.length))
})

test('whitening is dividing by the Cholesky factor of the covariance matrix', () => {
  for (const noise of [
    { share: 0.6, persistence: 0.8 },
    { share: 0.98, persistence: 0.97 },
    { share: 0.2, persistence: 0.3 },
  ]) {
    const places = placesWithGaps(90, 30, 21)
    const draw = normals(5)
    const values = Float64Array.from(places.position, () => draw())
    const expected = forward(cholesky(covariance(places, noise)), values)
    const [white] = whiten([values], places, noise) as [Float64Array]
    for (let i = 0; i < values.length; i++) expect(Math.abs(white[i]! - expected[i]!)).toBeLessThan(1e-9)
  }
})

test('least squares on whitened values is generalised least squares', () => {
  const noise = { share: 0.7, persistence: 0.75 }
  const places = placesWithGaps(120, 40, 31)
  const n = places.position.length
  const draw = normals(6)
  const x = Float64Array.from({ length: n }, () => draw())
  const e = simulate(places, noise, 7)
  const y = Float64Array.from({ length: n }, (_, i) => 2 + 0.4 * x[i]! + e[i]!)
  const one = new Float64Array(n).fill(1)
  const [whiteX, whiteY, whiteOne] = whiten([x, y, one], places, noise) as [
    Float64Array,
    Float64Array,
    Float64Array,
  ]
  const fromWhite = leastSquares(
    Array.from(whiteX, (value, i) => [value, whiteOne[i]!]),
    [...whiteY],
    new Array<number>(n).fill(1),
  )

  // Dense: X' V^-1 X b = X' V^-1 y, V^-1 applied by elimination.
  const matrix = covariance(places, noise)
  const [vx, vOne, vy] = [x, one, y].map((series) => solve(matrix, [...series])) as [
    number[],
    number[],
    number[],
  ]
  const dot = (a: ArrayLike<number>, b: ArrayLike<number>): number =>
    Array.from(a).reduce((sum, value, i) => sum + value * b[i]!, 0)
  const [slope, level] = solve(
    [
      [dot(x, vx), dot(x, vOne)],
      [dot(one, vx), dot(one, vOne)],
    ],
    [dot(x, vy), dot(one, vy)],
  ) as [number, number]
  expect(Math.abs(fromWhite[0]! - slope)).toBeLessThan(1e-9)
  expect(Math.abs(fromWhite[1]! - level)).toBeLessThan(1e-9)
})

test('without memory whitening changes nothing, and the input stays as it was', () => {
  const values = Float64Array.from([1, -2, 3])
  const places = { position: [0, 1, 2], chain: [0, 0, 0] }
  expect(whiten([values], places, { share: 0, persistence: 0.9 })).toEqual([values])
  whiten([values], places, { share: 0.5, persistence: 0.9 })
  expect([...values]).toEqual([1, -2, 3])
})
