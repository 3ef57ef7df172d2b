import { changeInterval, changePoints, meanCost, medianOf } from '../../kernel/stats/index.ts'
import { blockNoise } from '../changes/offset-changes-noise.ts'

/** Length of the bins that are searched. */
const BIN_MS = 6 * 3_600_000
/** Rows of a bin without which it says nothing, as a share of those due. */
const BIN_SHARE = 0.2
/** Shorter levels are not told from weather, bins. */
const MIN_BINS = 4
const NOISE_BINS = [1, 2, 4, 8, 16] as const
/** What a step costs, in variances times ln n: its place counts for two parameters. */
const PENALTY_PARAMETERS = 3
/** Standard errors that a step must exceed, besides its least size. */
const LEAST_Z = 5

export interface LevelStep {
  /** First moment of the new level, epoch ms; right to a bin of six hours. */
  readonly atMs: number
  /** 95 %, epoch ms. */
  readonly interval: readonly [number, number]
  readonly before: number
  readonly after: number
  /** Size over its standard error, weather that hangs together over days included. */
  readonly z: number
}

export interface LevelHistory {
  readonly steps: readonly LevelStep[]
  readonly first: number
  readonly last: number
  /** Bins of six hours that were searched; fewer than twice the shortest level: nothing was. */
  readonly bins: number
}

/**
 * Moments at which the level of a series of rows changed, from medians of six hours.
 *
 * @param values  length n; NaN = missing. Angles: about 0, far from the seam.
 * @param leastSize  smaller steps are left alone.
 */
export function levelSteps(
  time: Float64Array,
  values: Float64Array,
  { intervalMs, leastSize }: { intervalMs: number; leastSize: number },
): LevelHistory {
  const startMs: number[] = []
  const medians: number[] = []
  const least = Math.max(2, (BIN_SHARE * BIN_MS) / intervalMs)
  for (let from = 0; from < time.length;) {
    const bin = Math.floor(time[from]! / BIN_MS)
    let to = from
    while (to < time.length && Math.floor(time[to]! / BIN_MS) === bin) to++
    const known = values.subarray(from, to).filter((value) => !Number.isNaN(value))
    if (known.length >= least) {
      startMs.push(time[from]!)
      medians.push(medianOf(known))
    }
    from = to
  }
  const n = medians.length
  const none = { steps: [], first: medianOf(medians), last: medianOf(medians), bins: n }
  if (n < 2 * MIN_BINS) return none
  const noise = blockNoise(new Float64Array(n).fill(1), medians, NOISE_BINS)
  if (!(noise >= 0)) return none
  const cost = meanCost(medians)
  const penalty = PENALTY_PARAMETERS * Math.log(n) * noise
  let changes = [...changePoints(cost, { penalty, minLength: MIN_BINS }).changes]
  let found = stepsAt(medians, changes, noise)
  for (;;) {
    // The weakest goes first: its neighbours may be the stronger for it.
    const weak = found.reduce((w, step, k) => (step.z < (found[w]?.z ?? Infinity) ? k : w), -1)
    const tooWeak = found.some(({ z, size }) => !(z >= LEAST_Z && size >= leastSize))
    if (!tooWeak) break
    const drop = found.findIndex(({ size }) => !(size >= leastSize))
    changes = changes.filter((_, k) => k !== (drop >= 0 ? drop : weak))
    found = stepsAt(medians, changes, noise)
  }
  const ends = [0, ...changes, n]
  const level = (k: number): number => medianOf(medians.slice(ends[k], ends[k + 1]))
  const steps = changes.map((change, k): LevelStep => {
    const place = changeInterval(cost, {
      from: ends[k]!,
      to: ends[k + 2]!,
      scale: noise,
      minLength: MIN_BINS,
    })
    return {
      atMs: startMs[change]!,
      interval: [startMs[Math.max(0, place.low - 1)]!, startMs[place.high] ?? startMs[n - 1]!],
      before: level(k),
      after: level(k + 1),
      z: found[k]!.z,
    }
  })
  return { steps, first: level(0), last: level(changes.length), bins: n }
}

function stepsAt(
  values: readonly number[],
  changes: readonly number[],
  noise: number,
): { size: number; z: number }[] {
  const ends = [0, ...changes, values.length]
  return changes.map((change, k) => {
    const before = values.slice(ends[k], change)
    const after = values.slice(change, ends[k + 2])
    const size = Math.abs(medianOf(after) - medianOf(before))
    const error = Math.sqrt(noise * (1 / before.length + 1 / after.length))
    return { size, z: error > 0 ? size / error : Infinity }
  })
}
