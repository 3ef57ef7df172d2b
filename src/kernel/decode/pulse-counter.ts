import { InputError } from '../../errors.ts'

/** Counts by level A and B before and after, as 8 prev A + 4 prev B + 2 A + B. @source TI MSP430x4xx guide, table 24-8 */
const STEPS = (() => {
  const steps = new Int8Array(16)
  for (const [from, to] of [
    [0b00, 0b01],
    [0b01, 0b11],
    [0b11, 0b10],
    [0b10, 0b00],
  ] as const) {
    steps[4 * from + to] = 1
    steps[4 * to + from] = -1
  }
  return steps
})()
const BOTH_CHANGED = 0b11

export interface PulseScale {
  /** Pulses of track A per turn of the encoder, >= 1; teeth of the yaw ring where a proximity sensor counts those. */
  readonly pulsesPerTurn: number
  /**
   * true: tracks A and B a quarter pulse apart, every edge counts, four a pulse. false: each rise of A counts one, forwards
   * where B is high at that moment (pulse and direction). Default true.
   */
  readonly quadrature?: boolean | undefined
  /** Turns of the encoder per turn of the nacelle, > 0. Default 1. */
  readonly gearRatio?: number | undefined
}

/** Levels of the tracks row by row, 0 or 1 (from 0.5 on: 1); length n; NaN = missing: the row is passed over. */
export interface PulseLevels {
  readonly a: Float64Array
  readonly b: Float64Array
  /** The index pulse, once a turn of the encoder. */
  readonly z?: Float64Array | undefined
}

/** An index pulse that came where the count did not expect it. */
export interface IndexError {
  readonly row: number
  /** Counts that were taken off to agree with it, signed; at most half a turn of the encoder. */
  readonly counts: number
}

/** What a stretch of levels counted to; of length n. */
export interface PulseCounts {
  /** Running count, wound over turns; NaN before the first known row. */
  readonly count: Float64Array
  /** Rows in which A or B changed. */
  readonly changes: number
  /** Rows in which A and B changed at once: the way is not known, and nothing is counted. */
  readonly jumps: readonly number[]
  readonly indexErrors: readonly IndexError[]
  /** Index pulses seen. */
  readonly indexPulses: number
}

/** Counts per turn of the encoder. */
export function countsPerTurn({ pulsesPerTurn, quadrature = true }: PulseScale): number {
  if (!(pulsesPerTurn >= 1)) {
    throw new InputError('OUT_OF_RANGE', `pulsesPerTurn: expected >= 1, got ${pulsesPerTurn}`)
  }
  return pulsesPerTurn * (quadrature ? 4 : 1)
}

/** Angle of the nacelle per count, degrees: 360 pulses without quadrature 1, 8 pulses 45, with quadrature a quarter of it. */
export function degPerCount(scale: PulseScale): number {
  const { gearRatio = 1 } = scale
  if (!(gearRatio > 0)) throw new InputError('OUT_OF_RANGE', `gearRatio: expected > 0, got ${gearRatio}`)
  return 360 / (countsPerTurn(scale) * gearRatio)
}

/**
 * Counts the pulses of an incremental encoder, stretch by stretch of a log. The count begins at 0: where that is, only an
 * index pulse with a known place, or a survey, tells. The first index pulse is the reference; each later one must come a whole
 * number of turns from it, else pulses were missed: the count is set right and the error noted.
 *
 * The index is taken at its lower edge, which a turn forwards enters and a turn backwards leaves.
 */
export class PulseCounter {
  readonly #perTurn: number
  readonly #quadrature: boolean
  /** 2 A + B; -1: not known yet. */
  #levels = -1
  #index = NaN
  #count = 0
  #reference = NaN

  /** @throws InputError OUT_OF_RANGE */
  constructor(scale: PulseScale) {
    this.#perTurn = countsPerTurn(scale)
    this.#quadrature = scale.quadrature ?? true
  }

  /** @throws InputError LENGTH_MISMATCH */
  add({ a, b, z }: PulseLevels): PulseCounts {
    const n = a.length
    for (const [name, values] of [
      ['b', b],
      ['z', z],
    ] as const) {
      if (values && values.length !== n) {
        throw new InputError('LENGTH_MISMATCH', `${name}: expected ${n} values, got ${values.length}`)
      }
    }
    const count = new Float64Array(n)
    const jumps: number[] = []
    const indexErrors: IndexError[] = []
    let changes = 0
    let indexPulses = 0
    for (let i = 0; i < n; i++) {
      if (!Number.isNaN(a[i]! + b[i]!)) {
        const levels = (a[i]! >= 0.5 ? 2 : 0) + (b[i]! >= 0.5 ? 1 : 0)
        const before = this.#count
        if (this.#levels >= 0) {
          if (levels !== this.#levels) changes++
          if (!this.#quadrature) {
            if (levels >= 2 && this.#levels < 2) this.#count += levels === 3 ? 1 : -1
          } else if ((levels ^ this.#levels) === BOTH_CHANGED) jumps.push(i)
          else this.#count += STEPS[4 * this.#levels + levels]!
        }
        this.#levels = levels
        const index = z ? z[i]! : NaN
        if (!Number.isNaN(index)) {
          const isHigh = index >= 0.5
          const wasHigh = this.#index >= 0.5
          if (!Number.isNaN(this.#index) && isHigh !== wasHigh) {
            const forwards = this.#count > before
            // Entered forwards, or left backwards: the lower edge lies between the counts before and after.
            if (this.#count !== before && forwards === isHigh) {
              indexPulses++
              const off = this.#offIndex(forwards ? this.#count : before)
              if (off !== 0) {
                indexErrors.push({ row: i, counts: off })
                this.#count -= off
              }
            }
          }
          this.#index = index
        }
      }
      count[i] = this.#levels < 0 ? NaN : this.#count
    }
    return { count, changes, jumps, indexErrors, indexPulses }
  }

  /** How far a count at the index stands from the nearest whole turn from the reference; the first one is the reference. */
  #offIndex(count: number): number {
    if (Number.isNaN(this.#reference)) {
      this.#reference = count
      return 0
    }
    const away = count - this.#reference
    return away - this.#perTurn * Math.round(away / this.#perTurn)
  }
}
