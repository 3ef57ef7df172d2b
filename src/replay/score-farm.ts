import {
  attributions,
  clockLags,
  dayBlocks,
  joinReports,
  nacelleRecords,
  northByWakes,
  pricesOver,
  signChecks,
  surveyedNorth,
  vaneAndAnemometer,
  vaneIdleBias,
  type HighRateRecord,
  withTrueNorth,
  type TurbineEvent,
} from '../analysis/index.ts'
import { buildFrame, type TurbineColumns, type TurbineFrame } from '../frame/index.ts'
import type { Receipt, ScoreSheet, ScoringSettings, SiteFile, TurbineSheet } from '../sheet/index.ts'
import { withCorrections } from './corrections.ts'
import { fleetResponse, responseWarnings } from './fleet-response.ts'
import type { Scorers } from './scorers.ts'
import { outlooks } from './outlook.ts'
import { worklistOf } from './worklist.ts'

export interface FarmRequest {
  readonly replay: string
  readonly version: string
  readonly site: SiteFile
  readonly settings: ScoringSettings
  readonly ratedPowerKw?: number | undefined
  readonly receipt: Receipt
  /** How the log was read, for the provenance. */
  readonly reading: Record<string, unknown>
  /** Turbine -> what went wrong while its raw words were decoded. */
  readonly decodingFindings?: ReadonlyMap<string, TurbineSheet['sensors']> | undefined
  /** Looks at the high-rate rows that the farm's intervals were made of; absent: they were logged as they are. */
  readonly examine?: ((turbines: readonly TurbineFrame[]) => Promise<readonly HighRateRecord[]>) | undefined
}

/**
 * Runs the questions over a farm and writes its score sheet. The sheet depends on the rows, the settings and the site
 * file alone: neither on threads nor on the order of rows or turbines.
 *
 * @param farm  rows of each turbine, sorted by time; turbines in byte order of their names.
 */
export async function scoreFarm(
  farm: readonly TurbineColumns[],
  request: FarmRequest,
  scorers: Scorers,
  onTurbine: (done: number, of: number) => void = () => undefined,
): Promise<ScoreSheet> {
  const { settings, receipt, site } = request
  const warnings = [...receipt.warnings]
  const intervalS = receipt.intervalS ?? site.intervalS ?? 600
  const frame = buildFrame(farm, { site, settings, intervalS, ratedPowerKw: request.ratedPowerKw })
  const days = frame.calendar.days
  const dayWeights = dayBlocks(days, settings)

  const highRate = request.examine ? await request.examine(frame.turbines) : []
  onTurbine(0, frame.turbines.length)
  const { intervalS: rowS, fromMs, toMs, turbines: rows } = frame
  // Begun first: where there are worker threads it goes on beside the questions below.
  const compared =
    settings.assumedResponsePctPerDeg === null
      ? scorers.compare({
          farm: { intervalS: rowS, fromMs, toMs, turbines: rows },
          days,
          dayWeights,
          settings,
        })
      : null
  // Whoever fails first is told; a comparison that fails beside it must not end the process.
  compared?.catch(() => undefined)
  const signs = signChecks(frame)
  const clocks = clockLags(frame)
  const north = nacelleRecords(
    frame,
    signs.map(({ agrees, neighboursAgree }) => agrees === false || neighboursAgree === false),
  )
  const wakes = northByWakes(frame, north.consensusDeg, dayWeights)
  const idle = vaneIdleBias(frame, north.consensusDeg)
  const sensors = vaneAndAnemometer(frame, settings).map((report, i) => joinReports([report, idle[i]!]))
  const prices = pricesOver(site.value, {
    timezone: frame.calendar.timezone,
    fromMs: frame.fromMs,
    toMs: frame.toMs,
  })
  const neighbours = await compared

  let done = 0
  const scored = Promise.all(
    frame.turbines.map(async (turbine, i): Promise<TurbineSheet> => {
      const sheet = await scorers.score({
        frame: turbine,
        settings,
        dayWeights,
        days,
        response: neighbours?.response.turbines[i] ?? null,
        farmEstimates: neighbours?.estimates[i] ?? [],
        freeStream: neighbours?.freeStream[i] ?? null,
        sign: signs[i]!,
        nacelle: north.turbines[i]!,
        events: eventsOf(site, turbine),
        longTerm: site.longTerm,
        prices,
        highRate: highRate.find((record) => record.turbine === turbine.turbine) ?? null,
        farmFindings: [
          ...(clocks[i] ?? []),
          ...sensors[i]!.findings,
          ...(request.decodingFindings?.get(turbine.turbine) ?? []),
        ],
        farmTests: sensors[i]!.tests,
      })
      onTurbine(++done, frame.turbines.length)
      return sheet
    }),
  )
  const proved = !site.corrections?.length
    ? []
    : scorers.prove({
        farm: { intervalS: rowS, fromMs, toMs, turbines: rows },
        days,
        dayWeights,
        settings,
        corrections: site.corrections,
        events: site.events ?? [],
        headings: north.turbines.map(({ heading }) => heading),
        responses: rows.map((_, i) => neighbours?.response.turbines[i] ?? null),
        blocked: signs.map(({ block }) => block !== null),
      })
  const [sheets, proofs] = await Promise.all([scored, proved])
  const weighed = attributions(sheets, settings.actionThresholdDeg)
  const expected = outlooks(sheets, settings.actionThresholdDeg)
  const ties = [wakes, surveyedNorth(frame.turbines, sheets)].filter((one) => one !== null)
  const tie = ties.sort((x, y) => x.halfWidthDeg - y.halfWidthDeg)[0] ?? null
  const turbines = sheets.map((sheet, i) => ({
    ...sheet,
    nacelle: withTrueNorth(sheet, tie),
    attribution: weighed[i]!,
    outlook: expected[i] ?? null,
  }))
  const response = fleetResponse(
    frame.turbines.map(({ model }) => model),
    settings,
    neighbours,
  )
  warnings.push(...responseWarnings(response))
  for (const turbine of frame.turbines) {
    for (const note of turbine.notes) warnings.push(`${turbine.turbine}: ${note}`)
  }
  for (const setup of site.turbines ?? []) {
    if (!farm.some(({ turbine }) => turbine === setup.turbine)) {
      warnings.push(`${setup.turbine}: in the site file, but not in the log`)
    }
  }
  const sheet: ScoreSheet = {
    replay: request.replay,
    site: site.site ?? null,
    window: { from: iso(frame.fromMs), to: iso(frame.toMs), intervalS },
    rows: {
      received: receipt.received,
      accepted: receipt.accepted,
      duplicate: receipt.duplicate,
      rejected: receipt.rejected,
    },
    receipt,
    provenance: {
      version: request.version,
      node: process.version,
      settings,
      reading: request.reading,
      inputs: receipt.inputs,
      seed: settings.seed,
    },
    fleet: {
      north: tie && {
        source: tie.source,
        shiftDeg: tie.shiftDeg,
        interval95Deg: [tie.shiftDeg - tie.halfWidthDeg, tie.shiftDeg + tie.halfWidthDeg],
        note: tie.note,
      },
      anemometerResponsePerDeg: response,
    },
    turbines,
    worklist: worklistOf(turbines, site, settings.actionThresholdDeg),
    corrections: [],
    warnings,
  }
  return withCorrections(sheet, proofs)
}

/** What the site file says was done to a turbine. A correction changes the logged vane only where the log holds it after correction. */
function eventsOf(site: SiteFile, turbine: TurbineFrame): TurbineEvent[] {
  const corrections = (site.corrections ?? [])
    .filter((correction) => correction.turbine === turbine.turbine)
    .map(({ at }) => ({
      atMs: Date.parse(at),
      changesOffset: turbine.setup.vane?.logged !== 'beforeCorrection',
    }))
  const events = (site.events ?? [])
    .filter((event) => event.turbine === undefined || event.turbine === turbine.turbine)
    .map(({ at, kind }) => ({ atMs: Date.parse(at), changesOffset: /\bvane\b/i.test(kind) }))
  return [...corrections, ...events]
}

function iso(ms: number): string {
  return new Date(ms).toISOString()
}
