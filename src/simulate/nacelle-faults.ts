import type { SizedFault } from './faults.ts'
import { STOP } from './operation.ts'
import type { RandomStream } from './random.ts'

/** Share of stops after which a sensor that loses its zero has another one. */
const LOST_AFTER_STOP = 0.9
/** A jump lasts from one time to the other, s. */
const JUMP_S = [60, 1200] as const

/** The reading's error became another one, at a second of the scenario. */
export interface NacelleStep {
  atS: number
  stepDeg: number
}

/** What goes wrong with the nacelle position sensor of one turbine. */
export class NacelleFaults {
  readonly steps: NacelleStep[] = []
  readonly #faults: readonly SizedFault[]
  readonly #stream: RandomStream
  readonly #nodeS: number
  #acting: SizedFault[] = []
  #second = 0
  #shiftDeg = 0
  #zeroDeg = 0
  #missedDeg = 0
  #jumpDeg = 0
  #jumpToS = NaN
  #lastHeadingDeg = NaN
  #lastStop = 0
  #held = NaN

  /** @param nodeS  seconds between two calls of `update` */
  constructor(faults: readonly SizedFault[], stream: RandomStream, nodeS: number) {
    this.#faults = faults
    this.#stream = stream
    this.#nodeS = nodeS
  }

  /** Takes up what is in force at a second of the scenario. */
  update(second: number): void {
    this.#second = second
    this.#acting = this.#faults.filter(({ fromS, toS }) => fromS <= second && second < toS)
    this.#shiftDeg = 0
    if (!this.#acting.some(({ kind }) => kind === 'nacelle-stuck')) this.#held = NaN
    if (this.#jumpToS <= second) this.#jump(0)
    for (const { kind, size, place, fromS } of this.#acting) {
      if (kind === 'nacelle-shift') this.#shiftDeg += size!
      if (kind === 'nacelle-drift') this.#shiftDeg += (size! * (second - fromS)) / 86400
      if (kind === 'nacelle-jumps' && this.#jumpDeg === 0) {
        if (this.#stream.uniform() < (place! * this.#nodeS) / 86400) {
          this.#jumpToS = second + this.#stream.between(...JUMP_S)
          this.#jump(this.#stream.uniform() < 0.5 ? -size! : size!)
        }
      }
    }
  }

  /** The logger takes means of wrapped readings. */
  get averagedAcrossNorth(): boolean {
    return this.#acting.some(({ kind }) => kind === 'nacelle-across-north')
  }

  /**
   * Reading before the north offset is added, degrees, not wrapped. To be called for every second, in order.
   *
   * @param stop  one of STOP
   */
  read(headingDeg: number, stop: number): number {
    const turned = headingDeg - this.#lastHeadingDeg
    const restarted = this.#lastStop !== STOP.none && stop === STOP.none
    this.#lastHeadingDeg = headingDeg
    this.#lastStop = stop
    let sign = 1
    let stepDeg = 0
    let stuck = false
    for (const { kind, size } of this.#acting) {
      if (kind === 'nacelle-missing-pulses' && turned > 0) this.#missedDeg += size! * turned
      else if (kind === 'nacelle-zero-lost' && restarted && this.#stream.uniform() < LOST_AFTER_STOP) {
        const zeroDeg = size! * this.#stream.normal()
        this.steps.push({ atS: this.#second, stepDeg: zeroDeg - this.#zeroDeg })
        this.#zeroDeg = zeroDeg
      } else if (kind === 'nacelle-reversed') sign = -1
      else if (kind === 'nacelle-coarse-step') stepDeg = size!
      else if (kind === 'nacelle-stuck') stuck = true
    }
    let reading = sign * headingDeg + this.#shiftDeg + this.#zeroDeg + this.#jumpDeg - this.#missedDeg
    if (stepDeg > 0) reading = Math.round(reading / stepDeg) * stepDeg
    if (!stuck) return reading
    if (Number.isNaN(this.#held)) this.#held = reading
    return this.#held
  }

  #jump(toDeg: number): void {
    this.steps.push({ atS: this.#second, stepDeg: toDeg - this.#jumpDeg })
    this.#jumpDeg = toDeg
    if (toDeg === 0) this.#jumpToS = NaN
  }
}
