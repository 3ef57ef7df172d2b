import { wrap360 } from '../kernel/angle/index.ts'
import { medianOf } from '../kernel/stats/index.ts'
import { airDensity, normalisedSpeed, pressureFromAltitude, ratedPowerFrom } from '../kernel/wind/index.ts'
import type { ScoringSettings, SiteFile, TurbineSetup } from '../sheet/index.ts'
import { acrossNorth, type AcrossNorth, type LoggedAngle } from './across-north.ts'
import { buildCalendar, type Calendar } from './calendar.ts'
import { curveAndRange } from './curve-and-range.ts'
import { followsNacelle, withoutPosition } from './following-position.ts'
import type { Frame, TurbineColumns, TurbineFrame } from './frame.ts'
import { icedAnemometers, type IcedAnemometer } from './iced-anemometer.ts'
import { sensorSpells } from './sensor-spells.ts'
import { setAsideBeforeCurve } from './set-aside.ts'
import { conventionalVane, type ConventionalVane } from './vane-convention.ts'

export interface FrameRequest {
  readonly site: SiteFile
  readonly settings: ScoringSettings
  /** Length of the rows' interval, s. */
  readonly intervalS: number
  /** For turbines whose site file gives none, kW. */
  readonly ratedPowerKw?: number | undefined
}

/**
 * The frame of a farm: clean columns brought to the signs and units of the questions, each row used or set aside for one reason.
 *
 * @param farm  one entry per turbine, rows sorted by time; at least one row in all.
 */
export function buildFrame(farm: readonly TurbineColumns[], request: FrameRequest): Frame {
  const intervalMs = request.intervalS * 1000
  let fromMs = Infinity
  let toMs = -Infinity
  for (const { time } of farm) {
    if (time.length === 0) continue
    fromMs = Math.min(fromMs, time[0]!)
    toMs = Math.max(toMs, time[time.length - 1]! + intervalMs)
  }
  const calendar = buildCalendar(request.site.timezone ?? 'UTC', fromMs, toMs)
  const setups = new Map((request.site.turbines ?? []).map((setup) => [setup.turbine, setup]))
  const iced = icedAnemometers(farm, intervalMs)
  return {
    intervalS: request.intervalS,
    fromMs,
    toMs,
    calendar,
    turbines: farm.map((columns, k) =>
      buildTurbine(
        columns,
        setups.get(columns.turbine) ?? { turbine: columns.turbine },
        calendar,
        request,
        iced[k]!,
      ),
    ),
  }
}

function buildTurbine(
  logged: TurbineColumns,
  setup: TurbineSetup,
  calendar: Calendar,
  request: FrameRequest,
  iced: IcedAnemometer,
): TurbineFrame {
  const { settings } = request
  const follows = followsNacelle(logged, request.intervalS * 1000)
  const columns = follows ? logged : withoutPosition(logged)
  const { time, numbers, texts } = columns
  const n = time.length
  const missing = new Float64Array(n).fill(NaN)
  const windSpeed = numbers['wind_speed'] ?? missing
  const power = numbers['power'] ?? missing
  const angles = anglesOf(columns, setup, power, request.intervalS * 1000)
  const { nacelle, windDirection } = angles
  const intervalMs = request.intervalS * 1000
  const faults = sensorSpells(
    columns,
    angles.vane,
    angles.convention,
    setup.vane?.sign ?? 1,
    iced,
    intervalMs,
  )
  const vane = angles.vane.map((value, i) => (faults.vaneFrozen[i] === 1 ? NaN : value))
  const indicatedDirection = nacelle
    ? nacelle.map((position, i) => wrap360(position + vane[i]!))
    : (windDirection?.map(wrap360) ?? missing)
  const air = airOf(columns, setup)
  const normalised = windSpeed.map((speed, i) =>
    Number.isNaN(air.density[i]!) ? speed : normalisedSpeed(speed, air.density[i]!),
  )
  const rated = ratedPowerOf(power, setup, request.ratedPowerKw)
  const notes = [...angles.notes, ...air.notes]
  if (!follows) {
    notes.push(
      'nacelle_position jumps about as no nacelle can: no other number leans on it, and what needs it cannot be told',
    )
  }

  const { reason, running, limited } = setAsideBeforeCurve(
    {
      time,
      intervalMs,
      ratedPowerKw: rated.powerKw,
      windSpeed,
      vane,
      power,
      powerMin: numbers['power_min'],
      powerLimit: numbers['power_limit'],
      pitch: numbers['pitch'],
      rotorSpeed: numbers['rotor_speed'],
      nacellePosition: nacelle,
      nacelleMin: numbers['nacelle_position_min'],
      nacelleMax: numbers['nacelle_position_max'],
      direction: nacelle || windDirection ? indicatedDirection : undefined,
      averagedAcrossNorth: angles.averaged,
      sensorFault: faults.fault,
      unmeasured: faults.unmeasured,
      coverage: numbers['coverage'],
      status: texts['status'],
      runningStatus: request.site.runningStatus,
      availability: texts['availability_category'],
      excluded: (request.site.exclude ?? [])
        .filter((window) => window.turbine === undefined || window.turbine === columns.turbine)
        .map((window) => [Date.parse(window.from), Date.parse(window.to)] as const),
    },
    settings,
  )
  if (texts['status'] && !request.site.runningStatus) {
    notes.push(
      'status is in the log but runningStatus is not in the site file: running is judged by power, pitch and rotor speed',
    )
  }
  const limitedShare =
    limited.reduce((sum, held) => sum + held, 0) /
    Math.max(
      1,
      running.reduce((sum, runs) => sum + runs, 0),
    )
  if (limitedShare > 0.5) {
    notes.push(
      `${Math.round(100 * limitedShare)} % of the running rows count as limited: check ratedPowerKw against power_limit, and pitch`,
    )
  }
  const judged = curveAndRange(reason, normalised, vane, power, {
    ratedPowerKw: rated.powerKw,
    windMinMs: settings.windMinMs,
    vaneMaxDeg: settings.vaneMaxDeg,
  })

  const day = new Int32Array(n)
  const night = new Uint8Array(n)
  for (let i = 0; i < n; i++) {
    const hour = calendar.hourOf(time[i]!)
    day[i] = calendar.dayOf(time[i]!)
    night[i] = hour >= 19 || hour < 7 ? 1 : 0
  }
  const turbulence = (numbers['wind_speed_sd'] ?? missing).map((sd, i) =>
    windSpeed[i]! > 0 ? sd / windSpeed[i]! : NaN,
  )
  return {
    turbine: columns.turbine,
    setup,
    model: setup.model ?? 'unknown',
    intervalS: request.intervalS,
    ratedPowerKw: rated.powerKw,
    ratedPowerSource: rated.source,
    time,
    day,
    night,
    windSpeed,
    windSpeed2: numbers['wind_speed_2'] ?? missing,
    airTemperature: numbers['air_temperature'] ?? missing,
    rotorSpeed: numbers['rotor_speed'] ?? missing,
    density: air.density,
    normalisedSpeed: normalised,
    turbulence,
    vane,
    vaneSource: angles.convention.source,
    vaneCentreDeg: angles.convention.centreDeg,
    vaneRead: angles.vane,
    vane2: faults.vane2,
    vaneSd: angles.convention.vaneSd,
    vaneMin: angles.convention.vaneMin,
    vaneMax: angles.convention.vaneMax,
    averagedAcrossNorth: angles.counts,
    spells: faults.spells,
    power,
    // As it came, so that what is wrong with it can be told.
    nacellePosition:
      logged.numbers['nacelle_position'] && !follows
        ? logged.numbers['nacelle_position']
        : (nacelle ?? missing),
    referenceYawError: numbers['reference_yaw_error'] ?? missing,
    referenceDirection: numbers['reference_direction'] ?? missing,
    indicatedDirection,
    densitySource: air.source,
    reason: judged.reason,
    running,
    limited,
    curve: judged.curve,
    windMinMs: settings.windMinMs,
    windMaxMs: judged.windMaxMs,
    notes,
  }
}

interface Angles {
  readonly convention: ConventionalVane
  /** NaN where it was averaged across north, or rests on a reading that was. */
  readonly vane: Float64Array
  readonly nacelle: Float64Array | undefined
  readonly windDirection: Float64Array | undefined
  /** 1 = one of the row's angles was averaged across the seam of its scale. */
  readonly averaged: Uint8Array
  readonly counts: AcrossNorth['counts']
  readonly notes: readonly string[]
}

/** Vane, nacelle and wind direction in one convention, without readings that are no direction. */
function anglesOf(
  columns: TurbineColumns,
  setup: TurbineSetup,
  power: Float64Array,
  intervalMs: number,
): Angles {
  const { numbers } = columns
  const convention = conventionalVane({
    vane: numbers['vane'],
    vaneMin: numbers['vane_min'],
    vaneMax: numbers['vane_max'],
    vaneSd: numbers['vane_sd'],
    windDirection: numbers['wind_direction'],
    nacellePosition: numbers['nacelle_position'],
    power,
    sign: setup.vane?.sign ?? 1,
    centre: setup.vane?.centre,
  })
  const { flags, counts } = acrossNorth({
    time: columns.time,
    intervalMs,
    power,
    vane: convention.vane,
    loggedVane: convention.source === 'vane' ? loggedAngle(columns, 'vane') : undefined,
    vaneCentreDeg: convention.centreDeg,
    nacellePosition: loggedAngle(columns, 'nacelle_position'),
    windDirection: loggedAngle(columns, 'wind_direction'),
  })
  const without = (angle: Float64Array, ...bad: Uint8Array[]): Float64Array =>
    angle.map((value, i) => (bad.some((flag) => flag[i] === 1) ? NaN : value))
  const worked = convention.source === 'wind direction less nacelle position'
  return {
    convention,
    vane: worked
      ? without(convention.vane, flags.nacelle_position, flags.wind_direction)
      : without(convention.vane, flags.vane),
    nacelle: numbers['nacelle_position'] && without(numbers['nacelle_position'], flags.nacelle_position),
    windDirection: numbers['wind_direction'] && without(numbers['wind_direction'], flags.wind_direction),
    averaged: flags.vane.map((flag, i) => flag | flags.nacelle_position[i]! | flags.wind_direction[i]!),
    counts,
    notes: [...convention.notes, ...acrossNorthNotes(counts)],
  }
}

function loggedAngle(columns: TurbineColumns, channel: string): LoggedAngle | undefined {
  const mean = columns.numbers[channel]
  if (!mean) return undefined
  return {
    mean,
    sd: columns.numbers[`${channel}_sd`],
    min: columns.numbers[`${channel}_min`],
    max: columns.numbers[`${channel}_max`],
  }
}

function acrossNorthNotes(counts: AcrossNorth['counts']): string[] {
  return Object.entries(counts)
    .filter(([, rows]) => rows > 0)
    .map(
      ([channel, rows]) =>
        `${channel} was averaged across the end of its scale in ${rows} rows: the logger takes arithmetic means of angles; these rows are set aside`,
    )
}

/** Density row by row. A gap in temperature or pressure takes the median of the log, so that one lost cell moves no row by percents. */
function airOf(
  columns: TurbineColumns,
  setup: TurbineSetup,
): { density: Float64Array; source: string; notes: string[] } {
  const temperature = columns.numbers['air_temperature']
  const usualTemperature = temperature ? medianOf(temperature) : NaN
  const n = columns.time.length
  if (!temperature || Number.isNaN(usualTemperature)) {
    return {
      density: new Float64Array(n).fill(NaN),
      source: 'none: wind speed as read',
      notes: ['no air temperature in the log: wind speed is not normalised to a density'],
    }
  }
  const pressure = columns.numbers['air_pressure']
  const usualPressure = pressure ? medianOf(pressure) : NaN
  const height = (setup.altitudeM ?? 0) + (setup.hubHeightM ?? 0)
  const standard = pressureFromAltitude(height)
  const hasPressure = pressure !== undefined && !Number.isNaN(usualPressure)
  const density = new Float64Array(n)
  for (let i = 0; i < n; i++) {
    const temperatureC = orElse(temperature[i]!, usualTemperature)
    const pressureHpa = hasPressure ? orElse(pressure[i]!, usualPressure) : standard
    density[i] = airDensity({ pressureHpa, temperatureC })
  }
  if (hasPressure) return { density, source: 'air temperature and pressure of the log', notes: [] }
  const stated = setup.altitudeM === undefined ? 'sea level (no altitude given)' : `${setup.altitudeM} m`
  return {
    density,
    source: `air temperature of the log, pressure of the standard atmosphere at ${stated}`,
    notes: [],
  }
}

function orElse(value: number, fallback: number): number {
  return Number.isNaN(value) ? fallback : value
}

function ratedPowerOf(
  power: Float64Array,
  setup: TurbineSetup,
  requested: number | undefined,
): { powerKw: number; source: TurbineFrame['ratedPowerSource'] } {
  if (setup.ratedPowerKw !== undefined) return { powerKw: setup.ratedPowerKw, source: 'site file' }
  if (requested !== undefined) return { powerKw: requested, source: 'request' }
  const powerKw = ratedPowerFrom(power)
  return Number.isNaN(powerKw) ? { powerKw, source: 'unknown' } : { powerKw, source: 'log' }
}
