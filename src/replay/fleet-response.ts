import type { Neighbours } from '../analysis/index.ts'
import type { ScoreSheet, ScoringSettings } from '../sheet/index.ts'

const NORMAL_95 = 1.959963984540054
/** Share of the form with local directions from which the sheet says that local speed and direction are linked. */
const LINKED = 0.5

type FleetResponse = ScoreSheet['fleet']['anemometerResponsePerDeg']
type ResponseEntry = FleetResponse[string]

/** Response of the anemometers of each model: what neighbours tell of it, else what the settings say. */
export function fleetResponse(
  models: readonly string[],
  settings: ScoringSettings,
  neighbours: Neighbours | null,
): FleetResponse {
  return Object.fromEntries(
    [...new Set(models)].map((model) => [
      model,
      measuredResponse(model, neighbours) ??
        assumedResponse(models.filter((other) => other === model).length, settings),
    ]),
  )
}

/** What is said aloud of responses that are not one number. */
export function responseWarnings(fleet: FleetResponse): string[] {
  return Object.entries(fleet).flatMap(([model, { changeWithSpeed, square }]) => {
    const shown = (value: number | null): string => (100 * (value ?? NaN)).toPrecision(2)
    return [
      ...(changeWithSpeed.beyondChance
        ? [
            `${model}: the response of the anemometers to the vane changes with wind speed, by ${shown(changeWithSpeed.size)} % per degree ` +
              'from 6 to 10 m/s; offsets are corrected by one response for all wind speeds',
          ]
        : []),
      ...(square.beyondChance
        ? [
            `${model}: the response of the anemometers is not alike on both sides of the vane: beside what is proportional, ` +
              `the reading changes by ${shown(square.size)} % per square degree`,
          ]
        : []),
    ]
  })
}

function measuredResponse(model: string, neighbours: Neighbours | null): ResponseEntry | null {
  const measured = neighbours?.response.models.find((other) => other.model === model)
  if (!measured) return null
  const shape = neighbours?.shapes.find((other) => other.model === model)
  const linked = (neighbours?.response.linkShare ?? 0) >= LINKED
  return {
    estimate: measured.perDeg,
    interval95: around(measured.perDeg, measured.sdPerDeg),
    spread: measured.spreadPerDeg,
    turbines: measured.turbines,
    source: `wind speed against neighbours at the same time${linked ? '; local speed and local direction are linked, which is taken out' : ''}`,
    changeWithSpeed: departureOf(shape?.withSpeed),
    square: departureOf(shape?.square),
  }
}

function assumedResponse(turbines: number, settings: ScoringSettings): ResponseEntry {
  const known = settings.assumedResponsePctPerDeg
  const untested = { changeWithSpeed: departureOf(undefined), square: departureOf(undefined) }
  if (known !== null) {
    return {
      estimate: known / 100,
      interval95: [known / 100, known / 100],
      spread: 0,
      turbines,
      source: 'taken as known: the setting assumedResponsePctPerDeg',
      ...untested,
    }
  }
  return {
    estimate: null,
    interval95: around(0, settings.responseSpreadPctPerDeg / 100),
    spread: null,
    turbines,
    source: 'not measured: the setting responseSpreadPctPerDeg says how large it may be',
    ...untested,
  }
}

function departureOf(
  measured: { size: number; sd: number; beyondChance: boolean } | undefined,
): ResponseEntry['square'] {
  if (!measured || !(measured.sd > 0)) return { size: null, interval95: [null, null], beyondChance: null }
  return {
    size: measured.size,
    interval95: around(measured.size, measured.sd),
    beyondChance: measured.beyondChance,
  }
}

function around(centre: number, sd: number): [number, number] {
  return [centre - NORMAL_95 * sd, centre + NORMAL_95 * sd]
}
