import type { SizedFault } from './faults.ts'

/** Ice needs so long to slow the cups down, s, and they answer with this time constant, s. */
const ICING_S = 3600
const ICED_LAG_S = 60

/** What goes wrong with the anemometer of one turbine. */
export class AnemometerFaults {
  readonly #faults: readonly SizedFault[]
  #factor = 1
  #stuck = false
  #iced = false
  #held = NaN

  constructor(faults: readonly SizedFault[]) {
    this.#faults = faults
  }

  /** Takes up what is in force at a second of the scenario. */
  update(second: number): void {
    const now = this.#faults.filter(({ fromS, toS }) => fromS <= second && second < toS)
    this.#factor = 1
    this.#stuck = now.some(({ kind }) => kind === 'anemometer-stuck')
    this.#iced = now.some(({ kind }) => kind === 'anemometer-iced')
    if (!this.#stuck && !this.#iced) this.#held = NaN
    for (const { kind, size, fromS } of now) {
      if (kind === 'anemometer-gain') this.#factor *= size!
      if (kind === 'anemometer-drift') {
        this.#factor *= Math.max(0, 1 + (size! * (second - fromS)) / 86400)
      }
      if (kind === 'anemometer-iced') {
        this.#factor *= 1 - (1 - size!) * Math.min(1, (second - fromS) / ICING_S)
      }
    }
  }

  /** What a sound anemometer that would read `windMs` (m/s, >= 0) reads now. */
  read(windMs: number): number {
    if (!this.#stuck && !this.#iced) return windMs * this.#factor
    if (Number.isNaN(this.#held)) this.#held = windMs
    if (!this.#stuck) this.#held += (windMs - this.#held) / ICED_LAG_S
    return this.#held * this.#factor
  }
}
