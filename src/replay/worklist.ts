import { byWorth } from '../sheet/by-worth.ts'
import type {
  SensorFinding,
  SiteFile,
  TurbineSetup,
  TurbineSheet,
  VisitValue,
  WorklistEntry,
} from '../sheet/index.ts'
import { correctionInWords, DESK_CHECK, firstStepDeg, mayEnter, signedDeg, whatIsMissing } from './advice.ts'
import { CAUTIONS } from './cautions.ts'
import { sharedOffsets, type SharedOffset } from './shared-offset.ts'

/** From here on a vane is looked at for damage before anything is entered, degrees. */
const LARGE_DEG = 10
const MONTHS_A_YEAR = 12
/** Sensors that somebody can be sent to; a clock or a column of the log is mended at the desk. */
const ON_THE_TURBINE: readonly SensorFinding['sensor'][] = [
  'vane',
  'nacelle-position',
  'anemometer',
  'yaw-drive',
  'controller',
  'power',
]
const BLANK: WorklistEntry['record'] = {
  asFoundDeg: null,
  asLeftDeg: null,
  changedAt: null,
  by: null,
  note: null,
}

/**
 * Who to visit first: turbines that stand off the wind, ranked by what a visit is expected to bring - net of its cost where a
 * price is known, else in energy - from misalignments that are corrected for the luck of the largest; after them turbines with a
 * faulty sensor. One visit a turbine, with all that was found there. Turbines that are off alike are one entry, which asks for a
 * measurement. A turbine that stands right is not on it.
 */
export function worklistOf(
  turbines: readonly TurbineSheet[],
  site: SiteFile,
  thresholdDeg: number,
): WorklistEntry[] {
  const shared = sharedOffsets(turbines, thresholdDeg)
  const inShared = new Set(shared.flatMap(({ members }) => members.map(({ turbine }) => turbine)))
  const setups = new Map((site.turbines ?? []).map((setup) => [setup.turbine, setup]))
  const offsets = turbines
    .filter(({ turbine, verdict }) => verdict === 'offset' && !inShared.has(turbine))
    .map((turbine) =>
      offsetEntry(turbine, site, {
        setup: setups.get(turbine.turbine),
        shared: shared.find(({ name }) => name === 'the farm' || name === `model ${turbine.model ?? ''}`),
      }),
    )
  const visited = new Set(offsets.map(({ turbine }) => turbine))
  const sensors = turbines
    .filter(({ turbine, sensors: found }) => !visited.has(turbine) && found.some(isFault))
    .map(sensorEntry)
  return [
    ...[...offsets, ...shared.map((one) => sharedEntry(one, site))].sort(byWorth),
    ...sensors.sort((a, b) => (a.turbine < b.turbine ? -1 : 1)),
  ]
}

function isFault(finding: SensorFinding): boolean {
  return (
    finding.severity === 'fault' && finding.howSure !== 'possible' && ON_THE_TURBINE.includes(finding.sensor)
  )
}

function offsetEntry(
  sheet: TurbineSheet,
  site: SiteFile,
  { setup, shared }: { setup: TurbineSetup | undefined; shared: SharedOffset | undefined },
): WorklistEntry {
  const { staticOffset, outlook } = sheet
  const standing = staticOffset.standingMisalignmentDeg ?? NaN
  const enters = mayEnter(staticOffset, sheet.verdict) && shared === undefined
  const found = sheet.sensors.filter(({ severity }) => severity !== 'info')
  const damage = lookForDamage(standing, staticOffset.byCondition.curve !== null)
  return {
    turbine: sheet.turbine,
    turbines: [sheet.turbine],
    kind: 'offset',
    standingMisalignmentDeg: standing,
    standingInterval95Deg: staticOffset.standingInterval95Deg,
    shrunkStandingDeg: outlook?.shrunkStandingDeg ?? null,
    probabilityBeyondThreshold: outlook?.probabilityBeyondThreshold ?? null,
    addToVaneDeg: enters ? standing : null,
    firstStepDeg: enters ? firstStepDeg(standing) : null,
    parameter: enters ? parameterOf(setup, standing) : null,
    whatToDo: enters
      ? correctionInWords(standing) + signNote(setup)
      : shared === undefined
        ? whatIsMissing(staticOffset, standing).join(' ')
        : `No number to enter yet: ${signedDeg(shared.commonDeg)} degrees of it are shared by ${shared.name} and must be settled first. Its own part is ${signedDeg(standing - shared.commonDeg)} degrees.`,
    expectedAnnualMwh: outlook?.expectedAnnualMwh ?? null,
    interval95Mwh: outlook?.interval95Mwh ?? [null, null],
    value: visitValue(sheet, site, 1),
    why: sheet.reason,
    reasons: reasonsOf(sheet),
    findings: found,
    checkFirst: [...damage, DESK_CHECK].join(' '),
    deskChecks: [...damage, ...deskChecks(setup), ...found.map(({ checkFirst }) => checkFirst)].filter(isNew),
    watchAfter: watchAfter(enters ? firstStepDeg(standing) : null),
    firmUp: firmUp(sheet),
    record: BLANK,
    cautions: [...CAUTIONS],
  }
}

/** A vane is looked at before its number is believed, where the number is unlikely or not one number. */
function lookForDamage(standingDeg: number, dependsOnWind: boolean): string[] {
  const then =
    'look for a damaged, loose or wrongly mounted vane before a number is entered, and tell the manufacturer or certifier.'
  if (dependsOnWind) return [`The offset depends on wind speed: ${then}`]
  return Math.abs(standingDeg) > LARGE_DEG ? [`It is more than ${LARGE_DEG} degrees: ${then}`] : []
}

function sensorEntry(sheet: TurbineSheet): WorklistEntry {
  const found = sheet.sensors.filter(({ severity }) => severity !== 'info')
  const faults = found.filter(isFault)
  const settles = sheet.attribution.wouldSettle
  return {
    turbine: sheet.turbine,
    turbines: [sheet.turbine],
    kind: 'sensor',
    standingMisalignmentDeg: null,
    standingInterval95Deg: [null, null],
    shrunkStandingDeg: null,
    probabilityBeyondThreshold: sheet.outlook?.probabilityBeyondThreshold ?? null,
    addToVaneDeg: null,
    firstStepDeg: null,
    parameter: null,
    whatToDo: `No vane offset to enter. Look after: ${[...new Set(faults.map(({ sensor }) => sensor))].join(', ')}.`,
    expectedAnnualMwh: null,
    interval95Mwh: [null, null],
    value: null,
    why: faults.map(({ finding }) => finding).join('; '),
    reasons: found.map(({ sensor, howSure, finding }) => `${sensor}, ${howSure}: ${finding}`),
    findings: found,
    checkFirst: faults[0]?.checkFirst ?? '',
    deskChecks: [...found.map(({ checkFirst }) => checkFirst), ...settles].filter(isNew),
    watchAfter: ['Score the turbine again with the days after the repair: the finding must be gone.'],
    firmUp:
      sheet.verdict === 'blocked' ? ['Days of rows after the repair: without them there is no offset.'] : [],
    record: BLANK,
    cautions: [...CAUTIONS],
  }
}

/** One measurement instead of as many climbs. */
function sharedEntry(shared: SharedOffset, site: SiteFile): WorklistEntry {
  const { name, commonDeg, interval95Deg, spreadDeg, members } = shared
  const [low, high] = interval95Deg
  const sum = (valueOf: (one: TurbineSheet) => number | null | undefined): number =>
    members.reduce((total, one) => total + (valueOf(one) ?? 0), 0)
  const names = members.map(({ turbine }) => turbine)
  const value = members.map((one) => visitValue(one, site, 0)).filter((one) => one !== null)
  const [first] = value
  return {
    turbine: `${name}, ${members.length} turbines`,
    turbines: names,
    kind: 'shared',
    standingMisalignmentDeg: commonDeg,
    standingInterval95Deg: [...interval95Deg],
    shrunkStandingDeg: commonDeg,
    probabilityBeyondThreshold: null,
    addToVaneDeg: null,
    firstStepDeg: null,
    parameter: null,
    whatToDo:
      `Do not climb ${members.length} times, and enter no number yet. Measure one or two of these turbines independently (a lidar or spinner anemometer on the nacelle, or the manufacturer’s alignment procedure). ` +
      'If they do stand off, mend what they share: a constant of the controller, its correction for the flow behind the rotor, or the way the vane is mounted. If they do not, it is the anemometers that answer to yaw, and the estimate that is off.',
    expectedAnnualMwh: sum(({ outlook }) => outlook?.expectedAnnualMwh),
    // That nothing stands off at all is a possibility as long as nobody has measured.
    interval95Mwh: [0, sum(({ outlook }) => outlook?.interval95Mwh[1])],
    value:
      first === undefined
        ? null
        : {
            ...first,
            annual: value.reduce((total, { annual }) => total + (annual ?? 0), 0),
            annualInterval95: [0, value.reduce((total, one) => total + (one.annualInterval95[1] ?? 0), 0)],
          },
    why: `${members.length} turbines of ${name} are off by the same amount: ${signedDeg(commonDeg)} degrees (95 %: ${signedDeg(low)} to ${signedDeg(high)}), and differ by ${spreadDeg.toFixed(1)} only`,
    reasons: members.map(
      ({ turbine, staticOffset }) =>
        `${turbine}: ${signedDeg(staticOffset.standingMisalignmentDeg ?? NaN)} degrees (95 %: ${(staticOffset.standingInterval95Deg as number[]).map(signedDeg).join(' to ')})`,
    ),
    findings: [],
    checkFirst:
      'At the desk: compare the vane offset, the flow correction and the software version of these turbines with one that stands right, and ask when they were last changed together.',
    deskChecks: [
      'Compare the vane offset, the flow correction and the software version of these turbines with one that stands right, and ask when they were last changed together.',
      'See in the sheet (fleet.anemometerResponsePerDeg) how well the response of their anemometers is known: 0.1 % per degree that is not, shifts all of them by about 3 degrees.',
      'Ask the manufacturer whether the wind direction of the controller contains a correction for the rotor’s wake, and at which yaw it is 0.',
    ],
    watchAfter: [
      'After a change at one turbine: look for the step of its heading against the others before the next is changed.',
    ],
    firmUp: [
      'An independent measurement of the yaw error at one of these turbines for two weeks (reference_yaw_error in the log, reference in the site file).',
    ],
    record: BLANK,
    cautions: [...CAUTIONS],
  }
}

/** @param visits  number of visits that are paid for; 0: their cost says nothing. */
function visitValue(
  { energyLoss, outlook }: TurbineSheet,
  site: SiteFile,
  visits: number,
): VisitValue | null {
  const { value } = energyLoss
  if (value === null || outlook === null) return null
  const price = value.annualPricePerMwh ?? NaN
  const cost = visits > 0 ? (site.value?.visitCost ?? NaN) * visits : NaN
  const annual = (outlook.expectedAnnualMwh ?? NaN) * price
  const ends = outlook.interval95Mwh.map((mwh) => (mwh ?? NaN) * price).sort((a, b) => a - b)
  const months = (sum: number): number | null => (sum > 0 ? (MONTHS_A_YEAR * cost) / sum : null)
  return {
    currency: value.currency,
    pricePerMwh: price,
    annual,
    annualInterval95: ends,
    visitCost: cost,
    firstYearNet: annual - cost,
    firstYearNetInterval95: ends.map((end) => end - cost),
    paybackMonths: months(annual),
    paybackInterval95Months: [months(ends[1] ?? NaN), months(ends[0] ?? NaN)],
  }
}

/** The controller's own parameter, where the site file tells it and counts as this list does. */
function parameterOf(setup: TurbineSetup | undefined, standingDeg: number): WorklistEntry['parameter'] {
  const currentDeg = setup?.vane?.correctionDeg
  if (currentDeg === undefined || setup?.vane?.sign === -1) return null
  return {
    name: 'vane.correctionDeg',
    currentDeg,
    afterFirstStepDeg: currentDeg + firstStepDeg(standingDeg),
    newDeg: currentDeg + standingDeg,
  }
}

function signNote(setup: TurbineSetup | undefined): string {
  return setup?.vane?.sign === -1
    ? ' This list counts clockwise as positive, while the log of this turbine counts the other way: find out which way its controller counts.'
    : ''
}

function reasonsOf(sheet: TurbineSheet): string[] {
  const { staticOffset, outlook, attribution } = sheet
  const shrunk = outlook?.shrunkStandingDeg ?? null
  const reasons = [
    `By ${staticOffset.method ?? 'no method'}, from ${staticOffset.rows} rows on ${staticOffset.days} days.`,
  ]
  if (shrunk !== null && outlook?.probabilityBeyondThreshold !== null) {
    reasons.push(
      `Seen among the other turbines it is ${signedDeg(shrunk)} degrees, and stands off by more than the threshold with a probability of ${percent(outlook?.probabilityBeyondThreshold ?? NaN)}; the gain is reckoned with that.`,
    )
  }
  const [own, ...others] = staticOffset.estimates
  if (own !== undefined && others.length > 0) {
    reasons.push(
      `Other ways to the offset d: ${[own, ...others].map(({ method, estimateDeg }) => `${method} ${estimateDeg === null ? 'none' : signedDeg(estimateDeg)}`).join('; ')}.`,
    )
  }
  for (const { at, sizeDeg, seenIn } of staticOffset.changes) {
    reasons.push(
      `It changed on ${at.slice(0, 10)} by ${sizeDeg === null ? 'some' : signedDeg(sizeDeg)} degrees (seen in ${seenIn}): ask what was done then.`,
    )
  }
  if (attribution.text !== '') reasons.push(attribution.text)
  return [...reasons, ...attribution.evidence]
}

function deskChecks(setup: TurbineSetup | undefined): string[] {
  const current = setup?.vane?.correctionDeg
  return [
    current === undefined
      ? 'Read the vane offset parameter of the controller and write it down: the site file does not tell it.'
      : `Read the vane offset parameter of the controller: by the site file it is ${signedDeg(current)} degrees. If it is not, stop and find out why.`,
    'Compare it with the record of the last change, and with its sister turbines.',
    'Ask for a photograph of the vane’s mark against the axis of the nacelle, and for the last service report: vane or anemometer replaced, software changed, blades worked on?',
    'See on the live display that the vane reads positive when the wind comes from clockwise of the nacelle, seen from above.',
  ]
}

function watchAfter(stepDeg: number | null): string[] {
  const step =
    stepDeg === null
      ? 'the degrees entered'
      : `${Math.abs(stepDeg).toFixed(1)} degrees ${stepDeg < 0 ? 'counter-clockwise' : 'clockwise'}`
  return [
    'In the first hours: yaw activity, loads and alarms. Go back to the value as found if anything is unusual.',
    `After a day or two: the heading against the neighbours must have moved by ${step}. If it moved the other way, undo the change at once.`,
    'Tell the change to the site (POST /v1/sites/{site}/corrections): the next replay judges whether it took hold, and after some weeks whether the power followed.',
  ]
}

function firmUp({ staticOffset }: TurbineSheet): string[] {
  const { response, statistical, exponent } = staticOffset.intervalParts
  const largest = Math.max(response ?? 0, statistical ?? 0, exponent ?? 0)
  const lines: string[] = []
  if (largest > 0 && largest === (statistical ?? 0))
    lines.push('More days of such rows: the scatter between days is the largest part of the interval.')
  if (largest > 0 && largest === (response ?? 0)) {
    lines.push(
      'More days of this turbine and its neighbours together: the response of the anemometer is the largest part of the interval.',
    )
  }
  if (largest > 0 && largest === (exponent ?? 0)) {
    lines.push(
      'The exponent is the largest part of the interval, and days do not settle it: a reference instrument would.',
    )
  }
  lines.push(
    'Two weeks of a nacelle lidar or spinner anemometer (reference_yaw_error) settle the offset by themselves.',
  )
  return lines
}

function percent(probability: number): string {
  return probability > 0.995 ? 'more than 99 %' : `${Math.round(100 * probability)} %`
}

function isNew(text: string, index: number, all: readonly string[]): boolean {
  return text !== '' && all.indexOf(text) === index
}
