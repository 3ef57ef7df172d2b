import { wrap180 } from '../kernel/angle/index.ts'
import {
  codeAngles,
  countsPerTurn,
  degPerCount,
  potentiometerAngles,
  PulseCounter,
  ultrasonicWind,
} from '../kernel/decode/index.ts'
import { RAW_CHANNELS, type RawChannel, type TurbineSetup } from '../sheet/index.ts'

/** Channels that raw words can stand for. */
export const DECODED_CHANNELS = ['vane', 'wind_speed', 'air_temperature', 'nacelle_position'] as const
export type DecodedChannel = (typeof DECODED_CHANNELS)[number]

/** So many index errors are kept one by one. */
const MOST_ERRORS = 1000
const US_PER_S = 1e6

/** What went wrong while raw words of one turbine were decoded. */
export interface DecodingAccount {
  /** Readings that are no words of their sensor, by raw channel. */
  readonly invalid: Readonly<Partial<Record<RawChannel, number>>>
  /** Pulses of the nacelle position; null = none are counted. */
  readonly pulses: {
    readonly degPerCount: number
    readonly countsPerTurn: number
    /** Rows in which a track changed, and those of them in which both did: the way is not known. */
    readonly changes: number
    readonly jumps: number
    /** Index pulses seen; 0 where there is no index. */
    readonly indexPulses: number
    /** Index pulses that came where the count did not expect them; the first thousand. */
    readonly indexErrors: readonly { readonly timeMs: number; readonly counts: number }[]
  } | null
}

/** How the raw words of one turbine are read. */
export interface DecodingPlan {
  /** What can be made of them. */
  readonly makes: readonly DecodedChannel[]
  /** Raw channels that are read for it. */
  readonly reads: readonly RawChannel[]
  /** One line for each sensor that the site file would have to describe. */
  readonly missing: readonly string[]
}

/** @param columns  of the log. */
export function decodingPlan(setup: TurbineSetup, columns: readonly string[]): DecodingPlan {
  const has = (name: RawChannel): boolean => columns.includes(name)
  const { vane, nacelle } = setup
  const makes = new Set<DecodedChannel>()
  const reads = new Set<RawChannel>()
  const missing: string[] = []
  const take = (channel: DecodedChannel, ...names: RawChannel[]): void => {
    makes.add(channel)
    for (const name of names) reads.add(name)
  }
  const lacks = (words: string, wanted: string): void => {
    missing.push(
      `${words} in the log cannot be read: the site file does not describe the sensor; add ${wanted} to the turbine`,
    )
  }
  const may = (kind: NonNullable<typeof vane>['kind']): boolean => (vane?.kind ?? kind) === kind
  if (has('vane_code') && may('encoder')) {
    if (vane?.bits !== undefined) take('vane', 'vane_code')
    else lacks('vane_code', 'vane.bits (and vane.code, vane.zeroDeg, vane.direction where they differ)')
  } else if (has('vane_ratio') && may('potentiometer')) {
    if (vane?.kind === 'potentiometer' || vane?.deadBandDeg !== undefined) take('vane', 'vane_ratio')
    else
      lacks(
        'vane_ratio',
        'vane.kind "potentiometer" and vane.deadBandDeg (and vane.zeroDeg, vane.direction where they differ)',
      )
  }
  const times = transitsOf(setup)
  if (has('transit_1')) {
    if (times.length === 0) lacks('transit_1 ...', 'ultrasonic.pathLengthM and ultrasonic.directionsDeg')
    else if (!times.every(has)) {
      missing.push(
        `ultrasonic.directionsDeg names ${times.length / 2} paths, but the log lacks ${times.filter((name) => !has(name)).join(', ')}`,
      )
    } else {
      take('wind_speed', ...times)
      take('air_temperature')
      if (!makes.has('vane') && may('ultrasonic')) take('vane')
    }
  }
  if (has('nacelle_code') && (nacelle?.kind ?? 'absolute-encoder') === 'absolute-encoder') {
    if (nacelle?.bits !== undefined) take('nacelle_position', 'nacelle_code')
    else lacks('nacelle_code', 'nacelle.bits (and nacelle.code, nacelle.gearRatio where they differ)')
  } else if (has('pulse_a')) {
    if (!has('pulse_b')) {
      missing.push('pulse_a in the log cannot be counted without pulse_b: the way round is not known')
    } else if (nacelle?.pulsesPerTurn !== undefined) {
      take('nacelle_position', 'pulse_a', 'pulse_b')
      if (has('pulse_z') && nacelle.index !== false) reads.add('pulse_z')
    } else lacks('pulse_a, pulse_b', 'nacelle.pulsesPerTurn (and nacelle.gearRatio, nacelle.quadrature)')
  }
  return { makes: [...makes], reads: [...reads], missing }
}

/** Whether a log holds raw words at all. */
export function holdsRawWords(columns: readonly string[]): boolean {
  return RAW_CHANNELS.some((name) => columns.includes(name))
}

function transitsOf({ ultrasonic }: TurbineSetup): RawChannel[] {
  const paths = ultrasonic?.directionsDeg.length ?? 0
  return Array.from({ length: 2 * paths }, (_, i) => `transit_${i + 1}` as RawChannel)
}

/**
 * Decodes the raw words of one turbine, stretch by stretch in order of time: pulses and turns are counted on. The nacelle
 * position comes wound over turns where it is counted or geared, from a zero that is that of the first row.
 */
export class RawWordDecoder {
  readonly #setup: TurbineSetup
  readonly #plan: DecodingPlan
  readonly #counter: PulseCounter | null
  readonly #invalid: Partial<Record<RawChannel, number>> = {}
  #lastCodeDeg = NaN
  #changes = 0
  #jumps = 0
  #indexPulses = 0
  readonly #indexErrors: { timeMs: number; counts: number }[] = []

  constructor(setup: TurbineSetup, plan: DecodingPlan) {
    this.#setup = setup
    this.#plan = plan
    this.#counter = plan.reads.includes('pulse_a') ? new PulseCounter(this.#pulseScale()) : null
  }

  /**
   * @param timeMs  rising, after the stretch before; length n.
   * @param words   raw channel -> values; length n; NaN = missing.
   * @returns what the plan makes; length n; NaN = missing.
   */
  add(
    timeMs: Float64Array,
    words: Readonly<Record<string, Float64Array>>,
  ): Partial<Record<DecodedChannel, Float64Array>> {
    const { reads, makes } = this.#plan
    const made: Partial<Record<DecodedChannel, Float64Array>> = {}
    const { vane = {} } = this.#setup
    const of = (name: RawChannel): Float64Array => words[name] ?? new Float64Array(timeMs.length).fill(NaN)
    if (reads.includes('vane_code')) {
      made.vane = this.#valid('vane_code', codeAngles(of('vane_code'), { ...vane, bits: vane.bits! }))
    } else if (reads.includes('vane_ratio')) {
      made.vane = this.#valid('vane_ratio', potentiometerAngles(of('vane_ratio'), vane))
    }
    const { ultrasonic } = this.#setup
    if (ultrasonic && makes.includes('wind_speed')) {
      const transitS = transitsOf(this.#setup).map((name) => of(name).map((us) => us / US_PER_S))
      const wind = ultrasonicWind(transitS, ultrasonic)
      made.wind_speed = wind.speedMs
      made.air_temperature = wind.temperatureC
      if (makes.includes('vane') && !made.vane) {
        const { zeroDeg = 0, direction = 1 } = vane
        made.vane = wind.directionDeg.map((angle) => wrap180(zeroDeg + direction * angle))
      }
    }
    if (reads.includes('nacelle_code')) made.nacelle_position = this.#geared(of('nacelle_code'))
    if (this.#counter) made.nacelle_position = this.#counted(timeMs, of)
    return made
  }

  get account(): DecodingAccount {
    return {
      invalid: this.#invalid,
      pulses: this.#counter && {
        degPerCount: degPerCount(this.#pulseScale()),
        countsPerTurn: countsPerTurn(this.#pulseScale()),
        changes: this.#changes,
        jumps: this.#jumps,
        indexPulses: this.#indexPulses,
        indexErrors: this.#indexErrors,
      },
    }
  }

  #pulseScale() {
    const { pulsesPerTurn = NaN, quadrature, gearRatio } = this.#setup.nacelle ?? {}
    return { pulsesPerTurn, quadrature, gearRatio }
  }

  #counted(timeMs: Float64Array, of: (name: RawChannel) => Float64Array): Float64Array {
    const { zeroDeg = 0, direction = 1 } = this.#setup.nacelle ?? {}
    const step = direction * degPerCount(this.#pulseScale())
    const counted = this.#counter!.add({
      a: of('pulse_a'),
      b: of('pulse_b'),
      ...(this.#plan.reads.includes('pulse_z') ? { z: of('pulse_z') } : {}),
    })
    this.#changes += counted.changes
    this.#jumps += counted.jumps.length
    this.#indexPulses += counted.indexPulses
    for (const { row, counts } of counted.indexErrors) {
      if (this.#indexErrors.length < MOST_ERRORS) this.#indexErrors.push({ timeMs: timeMs[row]!, counts })
    }
    return counted.count.map((count) => zeroDeg + step * count)
  }

  /** A geared encoder turns several times while the nacelle turns once: its turns are followed. */
  #geared(words: Float64Array): Float64Array {
    const { bits = NaN, code, gearRatio = 1, zeroDeg = 0, direction = 1 } = this.#setup.nacelle ?? {}
    if (gearRatio === 1) {
      return this.#valid('nacelle_code', codeAngles(words, { bits, code, zeroDeg, direction }))
    }
    const turned = this.#valid('nacelle_code', codeAngles(words, { bits, code }))
    const angles = turned.map((angle) => {
      if (Number.isNaN(angle)) return NaN
      const last = Number.isNaN(this.#lastCodeDeg) ? angle : this.#lastCodeDeg
      this.#lastCodeDeg = last + wrap180(angle - last)
      return this.#lastCodeDeg
    })
    return angles.map((angle) => zeroDeg + (direction * angle) / gearRatio)
  }

  #valid(
    channel: RawChannel,
    { angleDeg, invalid }: { angleDeg: Float64Array; invalid: number },
  ): Float64Array {
    if (invalid > 0) this.#invalid[channel] = (this.#invalid[channel] ?? 0) + invalid
    return angleDeg
  }
}
