import type { Spell } from './faults.ts'
import { PURPOSE, RandomStream } from './random.ts'
import type { FarmScenario } from './scenario.ts'

/** Minutes of weather before and after the window, for air that is still on its way or has passed. */
export const PAD_MIN = 60

/** Temperature at which sensors ice, and how long it takes to come and go, s. */
const ICING_C = -1
const CHILL_S = 3 * 3600

/** The weather of the whole farm at hub height, one value a minute; entry PAD_MIN is the first second of the window. */
export interface Weather {
  /** Undisturbed wind speed, m/s, > 0. */
  speedMs: Float64Array
  /** Where the wind comes from, degrees, unwrapped: a continuous line that turns as often as the wind does. */
  directionDeg: Float64Array
  /** Turbulence intensity of the undisturbed wind, no unit. */
  turbulence: Float64Array
  temperatureC: Float64Array
  pressureHpa: Float64Array
}

/**
 * Weather as a sum of mean-reverting processes. Time scales and sizes are common practice, no source, unless said:
 * - log wind speed: 15 h and sd 0.42, smoothed over 1 h, which gives the spread of a Weibull distribution with shape near 2;
 *   8 % more by day; and changes within the hour (1 h: 6 %, 10 min: 3 %) that the whole farm shares;
 * - direction: the rate of turning reverts over 6 h, so direction itself wanders through all sectors; changes within the
 *   hour (1 h: 4 degrees, 12 min: 2 degrees);
 * - fronts, one in 3 days: a veer of 50 +- 20 degrees within 20 to 60 min, with up to 30 % more wind for 2 h;
 * - turbulence: shape of the normal turbulence model of IEC 61400-1, (0.75 u + 5.6) / u; a third less by night;
 * - temperature and pressure: 4 degrees by day and night, 4 degrees over 40 h; 9 hPa over 48 h, less the altitude
 *   (hydrostatic, 288 K); while a sensor ices the farm has about -1 degrees.
 */
export function farmWeather(scenario: FarmScenario): Weather {
  const minutes = Math.ceil(scenario.days * 1440) + 1 + 2 * PAD_MIN
  const weather: Weather = {
    speedMs: new Float64Array(minutes),
    directionDeg: new Float64Array(minutes),
    turbulence: new Float64Array(minutes),
    temperatureC: new Float64Array(minutes),
    pressureHpa: new Float64Array(minutes),
  }
  const icingSpells = scenario.faults.filter(({ kind }) => kind.endsWith('-iced'))
  const synoptic = new RandomStream(scenario.seed, PURPOSE.synoptic)
  const meso = new RandomStream(scenario.seed, PURPOSE.mesoscale)
  const logSpeed = new Reverting(synoptic, 15 * 60)
  const turning = new Reverting(synoptic, 6 * 60)
  const warmth = new Reverting(synoptic, 40 * 60)
  const depth = new Reverting(synoptic, 48 * 60)
  const gustiness = new Reverting(synoptic, 3 * 60)
  const speedHour = new Reverting(meso, 60)
  const speedTen = new Reverting(meso, 10)
  const turnHour = new Reverting(meso, 60)
  const turnTwelve = new Reverting(meso, 12)
  const altitudeFactor = Math.exp((-9.80665 * (scenario.altitudeM + scenario.hubHeightM)) / (287.05 * 288))
  let smooth = logSpeed.value
  let drift = synoptic.between(0, 360)
  let veerLeftMin = 0
  let veerRate = 0
  let frontGust = 0

  for (let i = 0; i < minutes; i++) {
    const hour = (((scenario.startMs / 3600000 + (i - PAD_MIN) / 60) % 24) + 24) % 24
    const day = Math.cos(((hour - 14) / 12) * Math.PI)
    smooth += (logSpeed.step() - smooth) / 60
    if (synoptic.uniform() < 1 / (3 * 1440)) {
      veerLeftMin = Math.round(synoptic.between(20, 60))
      veerRate = (50 + 20 * synoptic.normal()) / veerLeftMin
      frontGust = synoptic.between(0, 0.3)
    }
    drift += (scenario.turningDegPerHour * turning.step()) / 60
    if (veerLeftMin > 0) {
      drift += veerRate
      veerLeftMin--
    }
    frontGust *= 1 - 1 / 120
    const speed =
      scenario.meanWindMs *
      Math.exp(0.42 * smooth - 0.42 ** 2 / 2) *
      (1 + 0.08 * day) *
      (1 + frontGust) *
      Math.max(0.5, 1 + 0.06 * speedHour.step() + 0.03 * speedTen.step())
    weather.speedMs[i] = speed
    weather.directionDeg[i] = drift + 4 * turnHour.step() + 2 * turnTwelve.step()
    const shape = (0.75 * speed + 5.6) / Math.max(speed, 3) / (0.75 + 5.6 / 15)
    weather.turbulence[i] =
      scenario.turbulenceIntensity * shape * (1 + 0.2 * day) * Math.exp(0.2 * gustiness.step())
    const warm = warmth.step()
    const low = depth.step()
    const seaLevel = 1013 + (scenario.densityVariation ? 9 * low : 0)
    const awayC = scenario.densityVariation ? 4 * Math.cos(((hour - 15) / 12) * Math.PI) + 4 * warm : 0
    weather.temperatureC[i] = 8 + awayC
    const icing = icingShare(icingSpells, (i - PAD_MIN) * 60)
    if (icing > 0) weather.temperatureC[i]! += icing * (ICING_C - 8 - 0.9 * awayC)
    weather.pressureHpa[i] = seaLevel * altitudeFactor
  }
  return weather
}

/** 1 while a sensor ices, 0 far from it: the whole farm cools within 3 h before, and warms within 3 h after. */
function icingShare(spells: readonly Spell[], second: number): number {
  let share = 0
  for (const { fromS, toS } of spells) {
    const outsideS = Math.max(fromS - second, second - toS, 0)
    share = Math.max(share, 1 - outsideS / CHILL_S)
  }
  return share
}

/** A first-order autoregressive process of variance one: a mean-reverting walk seen at equal steps. */
export class Reverting {
  value: number
  readonly #stream: RandomStream
  readonly #keep: number
  readonly #fresh: number

  /** @param steps time scale in steps, > 0: the correlation of values so many steps apart is 1/e. */
  constructor(stream: RandomStream, steps: number) {
    this.#stream = stream
    this.#keep = Math.exp(-1 / steps)
    this.#fresh = Math.sqrt(1 - this.#keep ** 2)
    this.value = stream.normal()
  }

  step(): number {
    this.value = this.#keep * this.value + this.#fresh * this.#stream.normal()
    return this.value
  }
}
