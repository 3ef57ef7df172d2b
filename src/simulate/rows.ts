import { DEG_PER_RAD, RAD_PER_DEG, wrap180, wrap360, yamartinoSigma } from '../kernel/angle/index.ts'

/** States of a turbine, in the order of their codes; the log's `status` is the one that held longest in the row. */
export const STATES = ['run', 'limited', 'idle', 'stop', 'storm', 'untwist'] as const
export const STATE = { run: 0, limited: 1, idle: 2, stop: 3, storm: 4, untwist: 5 } as const

/** Numbers of a row, by canonical column; NaN = not logged. */
export const ROW_COLUMNS = [
  'wind_speed',
  'wind_speed_sd',
  'vane',
  'vane_sd',
  'vane_2',
  'nacelle_position',
  'yaw_active',
  'power',
  'power_sd',
  'pitch',
  'rotor_speed',
  'power_limit',
  'air_temperature',
  'air_pressure',
  'reference_yaw_error',
  'reference_wind_speed',
] as const
export type RowColumn = (typeof ROW_COLUMNS)[number]

/** The rows of one turbine: every array has one entry for each row. */
export interface TurbineRows {
  /** Start of the row, UTC epoch ms. */
  timeMs: Float64Array
  columns: Record<RowColumn, Float64Array>
  /** Code of the state that held longest, see STATES. */
  state: Uint8Array
  /** Known only in a made-up farm: mean true yaw error (degrees) and mean rotor-effective wind speed (m/s). */
  trueYawErrorDeg: Float64Array
  trueRotorWindMs: Float64Array
}

export function emptyRows(startMs: number, rateS: number, rows: number): TurbineRows {
  const columns = Object.fromEntries(
    ROW_COLUMNS.map((name) => [name, new Float64Array(rows).fill(NaN)]),
  ) as Record<RowColumn, Float64Array>
  return {
    timeMs: Float64Array.from({ length: rows }, (_, i) => startMs + i * rateS * 1000),
    columns,
    state: new Uint8Array(rows),
    trueYawErrorDeg: new Float64Array(rows),
    trueRotorWindMs: new Float64Array(rows),
  }
}

/** Seconds in a block. */
export const BLOCK_S = 600

/**
 * What one turbine did in each second of a block. The loop that makes the seconds and the one that makes rows of them
 * meet in arrays: passed as arguments, the numbers cost an allocation each whenever the engine does not inline the call.
 */
export class Seconds {
  readonly windMs = new Float64Array(BLOCK_S)
  /** [-180, 180]. */
  readonly vaneDeg = new Float64Array(BLOCK_S)
  readonly secondVaneDeg = new Float64Array(BLOCK_S)
  readonly headingDeg = new Float64Array(BLOCK_S)
  /** 1 while the nacelle turns. */
  readonly yawing = new Uint8Array(BLOCK_S)
  readonly powerKw = new Float64Array(BLOCK_S)
  readonly pitchDeg = new Float64Array(BLOCK_S)
  readonly rotorRpm = new Float64Array(BLOCK_S)
  readonly limitKw = new Float64Array(BLOCK_S)
  readonly state = new Uint8Array(BLOCK_S)
  readonly yawErrorDeg = new Float64Array(BLOCK_S)
  readonly rotorWindMs = new Float64Array(BLOCK_S)
}

/** Entries for each degree of the table of sines. */
const SINES_PER_DEG = 10
/** Sines from -180 to 270 degrees and one entry more, so that the cosine is read a quarter turn further on. */
const SINES = Float64Array.from({ length: 450 * SINES_PER_DEG + 2 }, (_, i) =>
  Math.sin((i / SINES_PER_DEG - 180) * RAD_PER_DEG),
)

/** A chord lies below its arc by this times part (1 - part) of the value: without it a frozen vane would have a spread of 0.05 degrees. */
const HALF_SQUARE_STEP = (RAD_PER_DEG / SINES_PER_DEG) ** 2 / 2

/**
 * Makes rows of seconds, as a logger does: means and standard deviations (divisor n), directions by their unit vectors,
 * the spread of directions by Yamartino's formula. One object for each turbine.
 */
export class RowMaker {
  readonly #rows: TurbineRows
  readonly #rateS: number
  readonly #northOffsetDeg: number
  readonly #nacelleScale: 'wrapped' | 'signed' | 'wound'
  /** The logger takes the arithmetic mean of wrapped readings. */
  averageAcrossNorth: boolean
  readonly #stateS = new Int32Array(STATES.length)
  #row = 0
  #n = 0
  #wind = 0
  #windSquares = 0
  #vaneSin = 0
  #vaneCos = 0
  readonly #secondVane: boolean
  #vane2 = 0
  #lastHeading = NaN
  #headingSin = 0
  #headingCos = 0
  #headingReading = 0
  #nacelleSin = 0
  #nacelleCos = 0
  #nacelle = 0
  #yawing = 0
  #power = 0
  #powerSquares = 0
  #pitch = 0
  #rotor = 0
  #limit = 0
  #yawError = 0
  #rotorWind = 0

  constructor(
    rows: TurbineRows,
    logger: {
      rateS: number
      northOffsetDeg: number
      nacelleScale: 'wrapped' | 'signed' | 'wound'
      averageAcrossNorth: boolean
      secondVane: boolean
    },
  ) {
    this.#rows = rows
    this.#rateS = logger.rateS
    this.#northOffsetDeg = logger.northOffsetDeg
    this.#nacelleScale = logger.nacelleScale
    this.averageAcrossNorth = logger.averageAcrossNorth
    this.#secondVane = logger.secondVane
  }

  /** Takes a block of seconds. */
  addBlock(block: Seconds): void {
    for (let i = 0; i < BLOCK_S; i++) this.#add(block, i)
  }

  #add(block: Seconds, second: number): void {
    const windMs = block.windMs[second]!
    const vaneDeg = block.vaneDeg[second]!
    const headingDeg = block.headingDeg[second]!
    const powerKw = block.powerKw[second]!
    if (headingDeg !== this.#lastHeading) {
      // The nacelle stands still most of the time: its sine is not worked out anew each second.
      this.#lastHeading = headingDeg
      this.#headingReading = headingDeg + this.#northOffsetDeg
      if (this.#nacelleScale === 'wrapped') this.#headingReading = wrap360(this.#headingReading)
      if (this.#nacelleScale === 'signed') this.#headingReading = wrap180(this.#headingReading)
      this.#headingSin = Math.sin(this.#headingReading * RAD_PER_DEG)
      this.#headingCos = Math.cos(this.#headingReading * RAD_PER_DEG)
    }
    this.#n++
    this.#wind += windMs
    this.#windSquares += windMs * windMs
    const at = (vaneDeg + 180) * SINES_PER_DEG
    const i = at | 0
    const j = i + 90 * SINES_PER_DEG
    const part = at - i
    const lift = 1 + part * (1 - part) * HALF_SQUARE_STEP
    this.#vaneSin += lift * (SINES[i]! + part * (SINES[i + 1]! - SINES[i]!))
    this.#vaneCos += lift * (SINES[j]! + part * (SINES[j + 1]! - SINES[j]!))
    this.#nacelleSin += this.#headingSin
    this.#nacelleCos += this.#headingCos
    this.#nacelle += this.#headingReading
    this.#yawing += block.yawing[second]!
    this.#power += powerKw
    this.#powerSquares += powerKw * powerKw
    this.#pitch += block.pitchDeg[second]!
    this.#rotor += block.rotorRpm[second]!
    this.#limit += block.limitKw[second]!
    this.#stateS[block.state[second]!]!++
    this.#yawError += block.yawErrorDeg[second]!
    this.#rotorWind += block.rotorWindMs[second]!
    if (this.#secondVane) this.#vane2 += block.secondVaneDeg[second]!
    if (this.#n === this.#rateS) this.#finish()
  }

  #finish(): void {
    const { columns } = this.#rows
    const row = this.#row++
    const n = this.#n
    const wind = this.#wind / n
    const power = this.#power / n
    columns.wind_speed[row] = wind
    columns.vane[row] = Math.atan2(this.#vaneSin, this.#vaneCos) * DEG_PER_RAD
    if (this.#secondVane) columns.vane_2[row] = wrap180(this.#vane2 / n)
    if (n > 1) {
      columns.wind_speed_sd[row] = Math.sqrt(Math.max(0, this.#windSquares / n - wind * wind))
      columns.power_sd[row] = Math.sqrt(Math.max(0, this.#powerSquares / n - power * power))
      columns.vane_sd[row] = yamartinoSigma(this.#vaneSin / n, this.#vaneCos / n)
    }
    const turn = Math.atan2(this.#nacelleSin, this.#nacelleCos) * DEG_PER_RAD
    if (this.#nacelleScale === 'wound' || this.averageAcrossNorth) {
      columns.nacelle_position[row] = this.#nacelle / n
    } else {
      columns.nacelle_position[row] = this.#nacelleScale === 'signed' ? turn : wrap360(turn)
    }
    columns.yaw_active[row] = this.#yawing / n
    columns.power[row] = power
    columns.pitch[row] = this.#pitch / n
    columns.rotor_speed[row] = this.#rotor / n
    columns.power_limit[row] = this.#limit / n
    this.#rows.trueYawErrorDeg[row] = this.#yawError / n
    this.#rows.trueRotorWindMs[row] = this.#rotorWind / n
    let longest = 0
    for (let i = 1; i < this.#stateS.length; i++) {
      if (this.#stateS[i]! > this.#stateS[longest]!) longest = i
    }
    this.#rows.state[row] = longest
    this.#stateS.fill(0)
    this.#n = this.#wind = this.#windSquares = this.#vaneSin = this.#vaneCos = 0
    this.#nacelleSin = this.#nacelleCos = this.#nacelle = this.#yawing = 0
    this.#power = this.#powerSquares = this.#pitch = this.#rotor = this.#limit = 0
    this.#yawError = this.#rotorWind = this.#vane2 = 0
  }
}
