import type { SizedFault } from './faults.ts'
import type { RandomStream } from './random.ts'
import { Reverting } from './weather.ts'

/** Order in which what happens to a vane acts: the air, the shaft, the transducer, what holds it still. */
const KINDS = [
  'vane-idle-bias',
  'vane-noise',
  'vane-dead-sector',
  'vane-spikes',
  'vane-stuck-bit',
  'vane-coarse-step',
  'vane-frozen',
  'vane-iced',
] as const
/** A vane that nobody follows swings so far by itself: degrees rms, of 20 min and of single seconds. */
const SWING_SLOW_DEG = 3
const SWING_FAST_DEG = 4

/** What goes wrong with the vane of one turbine. */
export class VaneFaults {
  readonly #faults: readonly SizedFault[]
  readonly #stream: RandomStream
  readonly #swing: Reverting
  readonly #bits: number
  #acting: SizedFault[] = []
  #logged: SizedFault[] = []
  #secondDriftDeg = 0
  #held = NaN

  /**
   * @param nodeS  seconds between two calls of `update`
   * @param bits   of the disc, 0 = not quantised
   */
  constructor(faults: readonly SizedFault[], stream: RandomStream, nodeS: number, bits: number) {
    this.#faults = faults
    this.#stream = stream
    this.#bits = bits
    this.#swing = new Reverting(stream, 1200 / nodeS)
  }

  /** Takes up what is in force at a second of the scenario. */
  update(second: number): void {
    const now = this.#faults.filter(({ fromS, toS }) => fromS <= second && second < toS)
    this.#acting = KINDS.flatMap((kind) => now.filter((fault) => fault.kind === kind))
    this.#logged = now.filter(({ kind }) => kind === 'vane-not-followed' || kind === 'vane-reversed')
    if (!now.some(({ kind }) => kind === 'vane-frozen' || kind === 'vane-iced')) this.#held = NaN
    this.#secondDriftDeg = 0
    for (const { kind, size, fromS } of now) {
      if (kind === 'second-vane-drift') this.#secondDriftDeg += (size! * (second - fromS)) / 86400
    }
    if (this.#logged.length > 0) this.#swing.step()
  }

  /** Degrees that the second vane reads more. */
  get secondDriftDeg(): number {
    return this.#secondDriftDeg
  }

  /**
   * What a sound vane that would read `vaneDeg` reads now, [-180, 180).
   *
   * @param noiseDeg  the part of it that the rotor does not feel
   * @param driven    the rotor turns under load
   */
  read(vaneDeg: number, noiseDeg: number, driven: boolean): number {
    let reading = vaneDeg
    for (const { kind, size, place } of this.#acting) {
      if (kind === 'vane-idle-bias') {
        if (!driven) reading = this.#coded(reading + size!)
      } else if (kind === 'vane-noise') reading = this.#coded(reading + (size! - 1) * noiseDeg)
      else if (kind === 'vane-dead-sector') reading = besideSector(reading, size!, place!)
      else if (kind === 'vane-spikes') {
        if (this.#stream.uniform() < size! / 3600) reading = this.#stream.between(-180, 180)
      } else if (kind === 'vane-stuck-bit') reading = withStuckTrack(reading, this.#bits, size!, place!)
      else if (kind === 'vane-coarse-step') reading = wrapped(Math.round(reading / size!) * size!)
      else {
        if (Number.isNaN(this.#held)) this.#held = reading
        reading = this.#held
      }
    }
    return reading
  }

  /** As the disc reads it. */
  #coded(angleDeg: number): number {
    const stepDeg = 360 / 2 ** this.#bits
    return wrapped(this.#bits > 0 ? Math.round(angleDeg / stepDeg) * stepDeg : angleDeg)
  }

  /** What the log holds while the controller's vane, as the log would hold it, reads `vaneDeg`. */
  logged(vaneDeg: number): number {
    let logged = vaneDeg
    for (const { kind, size } of this.#logged) {
      if (kind === 'vane-reversed') logged = wrapped(-logged)
      else {
        const swing = SWING_SLOW_DEG * this.#swing.value + SWING_FAST_DEG * this.#stream.normal()
        logged = wrapped(size! * logged + swing)
      }
    }
    return logged
  }
}

/** Angles within the sector become the nearer of its edges. */
function besideSector(angleDeg: number, widthDeg: number, middleDeg: number): number {
  const away = wrapped(angleDeg - middleDeg)
  if (Math.abs(away) >= widthDeg / 2) return angleDeg
  return wrapped(middleDeg + (away < 0 ? -widthDeg / 2 : widthDeg / 2))
}

/** The angle that a Gray-coded disc of so many tracks shows when one of them (0 = finest) always reads 0 or 1. */
function withStuckTrack(angleDeg: number, bits: number, track: number, reads: number): number {
  const codes = 2 ** bits
  const code = ((Math.round((angleDeg / 360) * codes) % codes) + codes) % codes
  const gray = code ^ (code >> 1)
  let shown = reads >= 0.5 ? gray | (1 << track) : gray & ~(1 << track)
  for (let half = 1; half < bits; half *= 2) shown ^= shown >> half
  return wrapped((shown * 360) / codes)
}

function wrapped(angleDeg: number): number {
  return angleDeg - 360 * Math.floor((angleDeg + 180) / 360)
}
