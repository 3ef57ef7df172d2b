import { InputError } from '../errors.ts'
import { checkFault, type Fault, type Spell } from './faults.ts'

/** A spell with a set-point below rated, kW. */
export interface LimitSpell extends Spell {
  limitKw: number
}

/** A turbine's offset takes another value from some second on: a vane that was knocked, or a correction. */
export interface OffsetChange {
  turbine: number
  atS: number
  /** The offset of the controller's vane from then on, degrees. */
  toDeg: number
  /** True: someone entered a correction, and the site file says so. False: nobody knows. */
  entered: boolean
}

/** Someone set out to correct a vane offset. */
export interface Correction {
  turbine: number
  atS: number
  /** Degrees that the site file says were added to the controller's vane. */
  recordedDeg: number
  /** Degrees that were: as recorded; the other way round with the wrong sign; 0 when nothing was entered. */
  addedDeg: number
}

/**
 * Everything that a made-up farm and its weather depend on. `farmScenario` fills in what is not given.
 * Values without a source are common practice.
 */
export interface FarmScenario {
  /** 0 to 2^32 - 1. */
  seed: number
  /** Number of turbines, 1 to 500. */
  turbines: number
  days: number
  /** UTC epoch milliseconds of the first second. */
  startMs: number
  /** IANA zone, goes into the site file only: the log is written in UTC. */
  timezone: string
  /** Length of a row in seconds: a divisor of 86400. 1: every second is a row. */
  rateS: number
  /** Name of the site in the site file. */
  site: string
  model: string
  /** Letter before the turbine's number. */
  prefix: string

  /** p of the cosine law: power below rated follows the curve at u cos(g)^(p/3). */
  exponent: number
  /** Offset d of each turbine's controller vane, degrees; null: drawn, half within about 1 degree of 0, half 3 to 9 off. */
  offsetsDeg: readonly number[] | null
  offsetChanges: readonly OffsetChange[]
  corrections: readonly Correction[]
  /** k in vane = k g - d. */
  vaneGain: number
  /** The controller's own correction of each turbine, contained in the vane it uses; null: none. */
  correctionsDeg: readonly number[] | null
  /** Which vane is logged: the controller's, or the one before its correction. */
  vaneLogged: 'beforeCorrection' | 'afterCorrection'
  /** Noise of the vane that the rotor does not feel, degrees rms of single seconds. */
  vaneNoiseDeg: number
  /** The slow part of it (20 min), degrees rms. */
  vaneSlowNoiseDeg: number
  /** 0: not quantised; 8: 256 codes for a turn. */
  vaneBits: number

  /** a: relative change of the anemometer's reading per degree of vane, mean of the model. */
  anemometerResponsePerDeg: number
  /** Standard deviation of a between turbines. */
  anemometerResponseSpread: number
  /** Further terms of the reading, relative, alike on all turbines: times the square and the cube of the vane in degrees. */
  anemometerResponseSquarePerDeg2: number
  anemometerResponseCubePerDeg3: number
  /** Standard deviation of the anemometers' gains between turbines. */
  anemometerGainSpread: number
  /** Slow error (20 min) of the anemometer against the rotor's mean wind, relative, rms. */
  anemometerSlowError: number
  /** Noise of single seconds, m/s rms. */
  anemometerNoiseMs: number

  /** Correlation of local speed with local direction, on every time scale, -1 to 1. */
  linkCorrelation: number
  /** Mean of the wind speed at hub height before wakes, m/s. */
  meanWindMs: number
  /** Turbulence intensity at 15 m/s, mean of day and night; at other speeds in the shape of IEC 61400-1's normal model. */
  turbulenceIntensity: number
  /** Spread of local direction from seconds to minutes at 10 % turbulence, degrees. */
  directionSdDeg: number
  /** Local speed differences of about an hour, relative, rms. */
  localSpeedSd: number
  /** Local direction differences of about an hour, degrees rms. */
  localDirectionSdDeg: number
  /** Spread of the rate at which synoptic direction turns, degrees per hour. */
  turningDegPerHour: number
  /** False: temperature and pressure stand still. */
  densityVariation: boolean

  ratedPowerKw: number
  ratedWindMs: number
  rotorDiameterM: number
  hubHeightM: number
  altitudeM: number
  /** Slow drift of a turbine's power (3 days), relative, rms. */
  performanceDrift: number

  /** The mean of the vane over so many seconds decides when to yaw. */
  yawAverageS: number
  /** Yaw starts when that mean is further off than this, degrees. */
  yawThresholdDeg: number
  /** ... for so many seconds on end. */
  yawHoldS: number
  /** Yaw ends when the mean of 10 s is inside this, degrees. */
  yawStopDeg: number
  yawRateDegS: number

  /** Turbines in a row of the layout, distances in rotor diameters, bearing of the rows in degrees. */
  layout: { columns: number; spacingD: number; rowSpacingD: number; bearingDeg: number }
  wakes: boolean
  /** True: drawn, about 2 % of the time. */
  stops: boolean | readonly Spell[]
  limits: boolean | readonly LimitSpell[]

  /** North offset n of each turbine, degrees; null: drawn, 2 of 5 within a few degrees of 0, the others anything. */
  northOffsetsDeg: readonly number[] | null
  nacelleScale: 'wrapped' | 'signed' | 'wound'
  /** True: the logger takes the arithmetic mean of wrapped readings, and errs where north is crossed. */
  averageAcrossNorth: boolean
  /** Turbines (indices) with a reference for yaw error and wind speed on the nacelle. */
  references: readonly number[]
  /** Degrees that a second vane reads less than the first, beside noise of its own; null: there is none. */
  secondVaneOffsetDeg: number | null
  faults: readonly Fault[]
  /** Decimals of the vane in the log. */
  vaneDecimals: number
  /** Share of cells that are missing from the log. */
  missingCells: number
  /** Number of lines that are cut, unreadable, repeated or blank, of each kind. */
  brokenLines: number
}

const DEFAULTS: FarmScenario = {
  seed: 1,
  turbines: 8,
  days: 30,
  startMs: Date.UTC(2026, 2, 1),
  timezone: 'Europe/Berlin',
  rateS: 600,
  site: 'quern-hill',
  model: 'M1',
  prefix: 'Q',
  exponent: 3,
  offsetsDeg: null,
  offsetChanges: [],
  corrections: [],
  vaneGain: 1,
  correctionsDeg: null,
  vaneLogged: 'afterCorrection',
  vaneNoiseDeg: 3,
  vaneSlowNoiseDeg: 0.6,
  vaneBits: 0,
  anemometerResponsePerDeg: 0,
  anemometerResponseSpread: 0,
  anemometerResponseSquarePerDeg2: 0,
  anemometerResponseCubePerDeg3: 0,
  anemometerGainSpread: 0.02,
  anemometerSlowError: 0.022,
  anemometerNoiseMs: 0.15,
  linkCorrelation: 0,
  meanWindMs: 7.2,
  turbulenceIntensity: 0.085,
  directionSdDeg: 4.5,
  localSpeedSd: 0.03,
  localDirectionSdDeg: 2,
  turningDegPerHour: 5,
  densityVariation: true,
  ratedPowerKw: 2300,
  ratedWindMs: 12,
  rotorDiameterM: 104,
  hubHeightM: 90,
  altitudeM: 220,
  performanceDrift: 0.01,
  yawAverageS: 90,
  yawThresholdDeg: 8,
  yawHoldS: 60,
  yawStopDeg: 1.5,
  yawRateDegS: 0.4,
  layout: { columns: 4, spacingD: 5, rowSpacingD: 6, bearingDeg: 70 },
  wakes: true,
  stops: true,
  limits: true,
  northOffsetsDeg: null,
  nacelleScale: 'wrapped',
  averageAcrossNorth: false,
  references: [],
  secondVaneOffsetDeg: null,
  faults: [],
  vaneDecimals: 2,
  missingCells: 0,
  brokenLines: 0,
}

const RANGES: readonly [keyof FarmScenario, number, number][] = [
  ['seed', 0, 4294967295],
  ['turbines', 1, 500],
  ['days', 1 / 24, 1500],
  ['rateS', 1, 3600],
  ['exponent', 0.1, 9],
  ['vaneGain', 0.2, 5],
  ['vaneNoiseDeg', 0, 30],
  ['vaneSlowNoiseDeg', 0, 10],
  ['vaneBits', 0, 16],
  ['anemometerResponsePerDeg', -0.02, 0.02],
  ['anemometerResponseSpread', 0, 0.01],
  ['anemometerResponseSquarePerDeg2', -0.001, 0.001],
  ['anemometerResponseCubePerDeg3', -0.0001, 0.0001],
  ['anemometerGainSpread', 0, 0.2],
  ['anemometerSlowError', 0, 0.2],
  ['anemometerNoiseMs', 0, 2],
  ['linkCorrelation', -1, 1],
  ['meanWindMs', 2, 20],
  ['turbulenceIntensity', 0, 0.4],
  ['directionSdDeg', 0, 20],
  ['localSpeedSd', 0, 0.2],
  ['localDirectionSdDeg', 0, 20],
  ['turningDegPerHour', 0, 60],
  ['ratedPowerKw', 1, 50000],
  ['ratedWindMs', 6, 25],
  ['rotorDiameterM', 5, 500],
  ['hubHeightM', 5, 500],
  ['altitudeM', -500, 6000],
  ['performanceDrift', 0, 0.1],
  ['yawAverageS', 1, 900],
  ['yawThresholdDeg', 0.5, 45],
  ['yawHoldS', 0, 600],
  ['yawStopDeg', 0.1, 45],
  ['yawRateDegS', 0.05, 5],
  ['vaneDecimals', 0, 6],
  ['missingCells', 0, 0.5],
  ['brokenLines', 0, 1000],
]

const WHOLE: readonly (keyof FarmScenario)[] = [
  'seed',
  'turbines',
  'startMs',
  'rateS',
  'vaneBits',
  'yawHoldS',
  'vaneDecimals',
  'brokenLines',
]

/**
 * A complete scenario: what is given, and the defaults for the rest.
 *
 * @throws InputError OUT_OF_RANGE with the name of the value; LENGTH_MISMATCH where a list has not one entry for each turbine
 */
export function farmScenario(given: Partial<FarmScenario> = {}): FarmScenario {
  const scenario = { ...DEFAULTS, ...given }
  for (const [name, min, max] of RANGES) {
    const value = scenario[name] as number
    if (!(value >= min && value <= max)) {
      throw new InputError('OUT_OF_RANGE', `${name}: expected ${min} to ${max}, got ${value}`)
    }
  }
  for (const name of WHOLE) {
    const value = scenario[name] as number
    if (!Number.isSafeInteger(value)) {
      throw new InputError('OUT_OF_RANGE', `${name}: expected a whole number, got ${value}`)
    }
  }
  if (86400 % scenario.rateS !== 0) {
    throw new InputError('OUT_OF_RANGE', `rateS: expected a divisor of 86400, got ${scenario.rateS}`)
  }
  const seconds = scenarioSeconds(scenario)
  if (seconds % 600 !== 0 || seconds % scenario.rateS !== 0) {
    throw new InputError(
      'OUT_OF_RANGE',
      `days: expected a whole number of rows and of 10 minutes, got ${scenario.days}`,
    )
  }
  for (const name of ['offsetsDeg', 'correctionsDeg', 'northOffsetsDeg'] as const) {
    const list = scenario[name]
    if (list !== null && list.length !== scenario.turbines) {
      throw new InputError(
        'LENGTH_MISMATCH',
        `${name}: expected ${scenario.turbines} values, got ${list.length}`,
      )
    }
    const wrong = list?.find((value) => !(Math.abs(value) <= 360))
    if (wrong !== undefined) {
      throw new InputError('OUT_OF_RANGE', `${name}: expected -360 to 360, got ${wrong}`)
    }
  }
  if (!/^[A-Za-z0-9][A-Za-z0-9._-]{0,99}$/.test(scenario.site)) {
    // It becomes part of file names.
    throw new InputError(
      'OUT_OF_RANGE',
      `site: expected letters, digits, dots, dashes and underscores, got ${JSON.stringify(scenario.site)}`,
    )
  }
  const named = [
    ...scenario.offsetChanges,
    ...scenario.corrections,
    ...scenario.faults,
    ...(typeof scenario.stops === 'boolean' ? [] : scenario.stops),
    ...(typeof scenario.limits === 'boolean' ? [] : scenario.limits),
  ].map(({ turbine }) => turbine)
  for (const turbine of [...named, ...scenario.references]) {
    if (!(Number.isInteger(turbine) && turbine >= 0 && turbine < scenario.turbines)) {
      throw new InputError(
        'OUT_OF_RANGE',
        `turbine: expected an index of 0 to ${scenario.turbines - 1}, got ${turbine}`,
      )
    }
  }
  scenario.faults.forEach(checkFault)
  if (
    scenario.secondVaneOffsetDeg === null &&
    scenario.faults.some(({ kind }) => kind === 'second-vane-drift')
  ) {
    scenario.secondVaneOffsetDeg = 0
  }
  return scenario
}

/** Length of a scenario in seconds. */
export function scenarioSeconds(scenario: FarmScenario): number {
  return Math.round(scenario.days * 86400)
}
