import { STOP } from './operation.ts'

/** Cables allow so many degrees; then the turbine stops and turns back. */
const CABLE_DEG = 900
/** Nobody yaws in less wind, m/s of the anemometer over a minute. */
const LEAST_WIND_MS = 2.3
/** While a turbine idles a move needs so many times the yaw error. */
const IDLE_FACTOR = 2
/** Half the width of a sector in which the controller stands off the wind on purpose, degrees. */
const HALF_SECTOR_DEG = 30

/** How a controller and its drive behave; degrees and seconds. */
export interface YawBehaviour {
  /** The mean of the vane over so many seconds decides when to yaw. */
  averageS: number
  /** Yaw starts when that mean is further off than this, for so many seconds on end. */
  clockwiseThresholdDeg: number
  counterThresholdDeg: number
  holdS: number
  /** Yaw ends when the mean of 10 s is inside this. */
  stopDeg: number
  /** The nacelle turns on by so much after that. */
  coastDeg: number
  rateDegS: number
  /** What the controller holds its vane at while it faces a sector; null: 0 everywhere. */
  sector: { middleDeg: number; vaneDeg: number } | null
  untwists: boolean
}

/** Yaw controller and drive of one turbine, in steps of a second. It sees the vane and nothing else of the wind's direction. */
export class YawController {
  /** True heading, degrees, wound over several turns. */
  headingDeg: number
  /** Moves begun, untwisting not counted, and degrees that they travelled. */
  moves = 0
  travelDeg = 0
  /** -1, 0, 1: turns counter-clockwise, stands, turns clockwise. Untwisting is told apart. */
  yawing = 0
  #behaviour: YawBehaviour
  #keepMean: number
  readonly #keepShort = Math.exp(-1 / 5)
  #vaneMean = 0
  #vaneShort = 0
  #holdS = 0
  /** Degrees still to go once it was told to stop; Infinity: it was not. */
  #coastDeg = Infinity
  #untwistTo = NaN

  constructor(behaviour: YawBehaviour, headingDeg: number) {
    this.headingDeg = headingDeg
    this.#behaviour = behaviour
    this.#keepMean = Math.exp(-2 / behaviour.averageS)
  }

  /** From now on it behaves otherwise. */
  behave(behaviour: YawBehaviour): void {
    this.#behaviour = behaviour
    this.#keepMean = Math.exp(-2 / behaviour.averageS)
  }

  get untwisting(): boolean {
    return !Number.isNaN(this.#untwistTo)
  }

  /**
   * @param vaneDeg  what the controller's vane reads
   * @param windMs   the anemometer's mean of a minute
   * @param stop     one of STOP
   */
  step(vaneDeg: number, running: boolean, windMs: number, stop: number): void {
    const { stopDeg, coastDeg, rateDegS, untwists } = this.#behaviour
    this.#vaneMean = this.#keepMean * this.#vaneMean + (1 - this.#keepMean) * vaneDeg
    this.#vaneShort = this.#keepShort * this.#vaneShort + (1 - this.#keepShort) * vaneDeg
    if (this.untwisting) {
      const left = this.#untwistTo - this.headingDeg
      if (left > rateDegS) this.headingDeg += rateDegS
      else if (left < -rateDegS) this.headingDeg -= rateDegS
      else this.#untwistTo = NaN
      this.yawing = 0
      this.#vaneMean = vaneDeg
    } else if (this.yawing !== 0) {
      this.headingDeg += this.yawing * rateDegS
      this.travelDeg += rateDegS
      if (this.#coastDeg < Infinity) this.#coastDeg -= rateDegS
      else if ((this.#vaneShort - this.#wantedDeg()) * this.yawing < stopDeg) this.#coastDeg = coastDeg
      if (this.#coastDeg <= 0 || stop === STOP.maintenance) {
        this.yawing = 0
        this.#coastDeg = Infinity
        this.#vaneMean = this.#vaneShort
        this.#holdS = 0
        if (untwists && (this.headingDeg > CABLE_DEG || this.headingDeg < -CABLE_DEG)) {
          this.#untwistTo = this.headingDeg - 360 * Math.round(this.headingDeg / 360)
        }
      }
    } else this.#perhapsStart(running, windMs, stop)
  }

  #perhapsStart(running: boolean, windMs: number, stop: number): void {
    const { clockwiseThresholdDeg, counterThresholdDeg, holdS } = this.#behaviour
    const factor = running ? 1 : IDLE_FACTOR
    const offDeg = this.#vaneMean - this.#wantedDeg()
    const off = offDeg > factor * clockwiseThresholdDeg || offDeg < -factor * counterThresholdDeg
    this.#holdS = off ? this.#holdS + 1 : 0
    if (this.#holdS > holdS && windMs > LEAST_WIND_MS && stop !== STOP.maintenance) {
      this.yawing = offDeg > 0 ? 1 : -1
      this.moves++
    }
  }

  #wantedDeg(): number {
    const { sector } = this.#behaviour
    if (sector === null) return 0
    const away = this.headingDeg - sector.middleDeg
    return Math.abs(away - 360 * Math.round(away / 360)) < HALF_SECTOR_DEG ? sector.vaneDeg : 0
  }
}
