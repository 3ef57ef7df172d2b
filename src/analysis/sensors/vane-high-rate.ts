import { medianOf, robustSd } from '../../kernel/stats/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import type { SensorFinding } from '../../sheet/index.ts'
import { joinReports, notTested, tested, type SensorReport } from './sensor-report.ts'
import { deadSector, stuckBit } from './vane-codes.ts'
import { VISIT_BINS, type VaneDay } from './vane-day.ts'
import { ICING_MAX_C } from './vane-frozen.ts'
import { deadSectorFinding, stuckBitFinding } from './vane-steps.ts'

const FROZEN = 'frozen for minutes, in high-rate rows'
const STEP = 'step size, and whether it coarsened, in high-rate rows'
const BIT = 'stuck bit of an encoder, in high-rate rows'
const SECTOR = 'dead sector, in high-rate rows'
const NOISE = 'noise floor, in high-rate rows'
const SPIKES = 'spikes, in high-rate rows'
const LEADS = 'vane leads yaw moves'
const ALL = [FROZEN, STEP, BIT, SECTOR, NOISE, SPIKES, LEADS]
/** Days on either side of a date at which something changed. */
const FEW_DAYS = 3
const TOLD_STEP_DEG = 1.2
const COARSE_STEP_DEG = 5
/** Change of the noise floor that counts, as a factor, and in SDs of the difference between days. */
const NOISE_FACTOR = 1.5
const NOISE_Z = 6
/** Share of readings that may be spikes, and how many must be seen. */
const SPIKE_SHARE = 1e-5
const FEW_SPIKES = 10
/** Moves that must be seen; and the vane before them, signed by their direction, that leads and that does not, degrees. */
const FEW_MOVES = 30
const LEADS_DEG = 3
const LEADS_NOT_DEG = 1.5
/** More frozen spells than this are told as one. */
const MOST_SPELLS = 8

interface Day {
  readonly dayMs: number
  readonly vane: VaneDay
}

/**
 * The tests of a vane that need its readings by the second.
 *
 * @param days  in order of time; null or empty: the log holds no high-rate rows.
 */
export function vaneHighRate(frame: TurbineFrame, days: readonly Day[] | null): SensorReport {
  const read = (days ?? []).filter(({ vane }) => vane.readings > 0)
  if (read.length === 0 || frame.vaneSource !== 'vane') {
    return joinReports(ALL.map((test) => notTested('vane', test, 'needs high-rate rows with a vane')))
  }
  return joinReports([
    frozenReport(frame, read),
    stepReport(read),
    bitReport(read),
    sectorReport(read),
    noiseReport(read),
    spikeReport(read),
    leadReport(read),
  ])
}

function frozenReport(frame: TurbineFrame, days: readonly Day[]): SensorReport {
  const spells = days
    .flatMap(({ vane }) => vane.frozen)
    .filter(
      ({ fromMs, toMs }) =>
        !frame.spells.vaneFrozen.some((spell) => fromMs < spell.toMs && toMs > spell.fromMs),
    )
  const note = `${days.length} days; spells that the 10-minute rows show are told there`
  const tell = (list: typeof spells): SensorFinding => {
    const cold = medianOf(list.map(({ airTemperatureC }) => airTemperatureC)) <= ICING_MAX_C
    const minutes = list.reduce((sum, { fromMs, toMs }) => sum + toMs - fromMs, 0) / 60_000
    return {
      sensor: 'vane',
      kind: cold ? 'icing' : 'frozen',
      finding: `the vane stood still in wind for ${minutes.toFixed(0)} minutes${list.length > 1 ? ` in ${list.length} spells` : ` at ${list[0]!.valueDeg.toFixed(1)} degrees`}${cold ? ', near or below freezing: likely ice' : ''}`,
      severity: minutes >= 10 ? 'warn' : 'info',
      howSure: 'likely',
      checkFirst:
        'At the desk: alarms of the vane and its heating at that time, and whether the logger repeats its last value. Then play and bearing.',
      from: iso(list[0]!.fromMs),
      to: iso(list.at(-1)!.toMs),
      detail: {
        spells: list
          .slice(0, 50)
          .map((one) => ({ from: iso(one.fromMs), to: iso(one.toMs), readDeg: one.valueDeg })),
      },
    }
  }
  if (spells.length === 0) return tested('vane', FROZEN, note)
  const findings = spells.length > MOST_SPELLS ? [tell(spells)] : spells.map((spell) => tell([spell]))
  return tested('vane', FROZEN, note, findings)
}

function stepReport(days: readonly Day[]): SensorReport {
  const steps = days.filter(({ vane }) => vane.stepDeg > 0)
  if (steps.length === 0) return notTested('vane', STEP, 'no step in the readings')
  const usual = medianOf(steps.map(({ vane }) => vane.stepDeg))
  const note = `${steps.length} days, usual step ${usual.toFixed(3)} degrees`
  for (let k = FEW_DAYS; k <= steps.length - FEW_DAYS; k++) {
    const before = Math.max(...steps.slice(k - FEW_DAYS, k).map(({ vane }) => vane.stepDeg))
    const after = Math.min(...steps.slice(k).map(({ vane }) => vane.stepDeg))
    if (!(after >= 1.9 * before && after >= 0.3)) continue
    const finding: SensorFinding = {
      sensor: 'vane',
      kind: 'coarse-step',
      finding: `from ${iso(steps[k]!.dayMs).slice(0, 10)} on the vane reads in steps of ${after.toFixed(2)} degrees, before in steps of ${before.toFixed(2)}: a lost bit, or another resolution of encoder or logger`,
      severity: 'warn',
      howSure: 'certain',
      checkFirst:
        'At the desk: whether vane, converter or logging was changed on that day; then the raw word of the encoder while the vane is turned.',
      from: iso(steps[k]!.dayMs),
      to: null,
      detail: { beforeDeg: before, afterDeg: after },
    }
    return tested('vane', STEP, note, [finding])
  }
  if (usual < TOLD_STEP_DEG) return tested('vane', STEP, note)
  return tested('vane', STEP, note, [
    {
      sensor: 'vane',
      kind: 'coarse-step',
      finding: `the vane reads in steps of ${usual.toFixed(2)} degrees`,
      severity: usual >= COARSE_STEP_DEG ? 'warn' : 'info',
      howSure: 'certain',
      checkFirst: 'At the desk: resolution of the vane by its data sheet, and of the channel in the logger.',
      ...rangeOf(days),
      detail: { stepDeg: usual },
    },
  ])
}

function bitReport(days: readonly Day[]): SensorReport {
  const bits = medianOf(days.filter(({ vane }) => vane.bits > 0).map(({ vane }) => vane.bits))
  const coded = days.filter(({ vane }) => vane.bits === bits)
  if (coded.length === 0)
    return notTested('vane', BIT, 'the readings have no step of an encoder (360 / 2^n degrees)')
  const counts = sumOf(coded.map(({ vane }) => vane.codes))
  const found = stuckBit(counts)
  const visited = counts.filter((count) => count > 0).length
  return tested(
    'vane',
    BIT,
    `${visited} codes of ${bits} bits over ${coded.length} days`,
    found ? [stuckBitFinding(found, bits, rangeOf(coded))] : [],
  )
}

function sectorReport(days: readonly Day[]): SensorReport {
  if (!(
    medianOf(days.map(({ vane }) => vane.stepDeg)) < 1 || days.every(({ vane }) => Number.isNaN(vane.stepDeg))
  )) {
    return notTested('vane', SECTOR, 'needs a vane of finer steps than a degree')
  }
  const visits = sumOf(days.map(({ vane }) => vane.visits))
  const found = deadSector(visits)
  const seen = (100 * visits.filter((count) => count >= 10).length) / VISIT_BINS
  return tested(
    'vane',
    SECTOR,
    `${seen.toFixed(0)} % of all angles, by 2 degrees, were visited ten times or more`,
    found ? [deadSectorFinding(found, rangeOf(days))] : [],
  )
}

function noiseReport(days: readonly Day[]): SensorReport {
  const known = days.filter(({ vane }) => vane.noiseFloorDeg > 0)
  const floor = known.map(({ vane }) => Math.log(vane.noiseFloorDeg))
  if (known.length < 2 * FEW_DAYS) return notTested('vane', NOISE, `needs ${2 * FEW_DAYS} days`)
  const noise = robustSd(floor.slice(1).map((value, i) => value - floor[i]!)) / Math.SQRT2
  let best = { at: -1, z: 0, size: 0 }
  for (let k = FEW_DAYS; k <= floor.length - FEW_DAYS; k++) {
    const size = medianOf(floor.slice(k)) - medianOf(floor.slice(0, k))
    // Days that hang together do not average out: the error stays that of a few.
    const z =
      Math.abs(size) /
      (Math.max(noise, 0.02) * Math.sqrt(1 / Math.min(k, 4) + 1 / Math.min(floor.length - k, 4)))
    if (z > best.z) best = { at: k, z, size }
  }
  const note = `quietest tenth of the minutes of ${known.length} days: ${Math.exp(medianOf(floor)).toFixed(2)} degrees from reading to reading`
  if (best.z < NOISE_Z || Math.abs(best.size) < Math.log(NOISE_FACTOR)) return tested('vane', NOISE, note)
  const factor = Math.exp(best.size)
  return tested('vane', NOISE, note, [
    {
      sensor: 'vane',
      kind: 'noise-changed',
      finding: `from ${iso(known[best.at]!.dayMs).slice(0, 10)} on the vane's noise from reading to reading is ${factor.toFixed(2)} times what it was`,
      severity: 'warn',
      howSure: 'likely',
      checkFirst:
        'At the desk: whether vane, cable or the controller’s filter was changed on that day. Then a photograph of the vane, and its play by hand.',
      from: iso(known[best.at]!.dayMs),
      to: null,
      detail: { factor, measuredBy: 'readings' },
    },
  ])
}

function spikeReport(days: readonly Day[]): SensorReport {
  const total = (valueOf: (vane: VaneDay) => number): number =>
    days.reduce((sum, { vane }) => sum + valueOf(vane), 0)
  const rows = total(({ spikeRows }) => spikeRows)
  const spikes = total(({ spikes: count }) => count)
  if (rows === 0) return notTested('vane', SPIKES, 'needs running rows of 10 s or less')
  const note = `${rows} running readings`
  if (spikes < FEW_SPIKES || spikes < SPIKE_SHARE * rows) return tested('vane', SPIKES, note)
  const largest = Math.max(...days.map(({ vane }) => vane.largestSpikeDeg))
  return tested('vane', SPIKES, note, [
    {
      sensor: 'vane',
      kind: 'spikes',
      finding: `the vane jumps away and back ${spikes} times in ${rows} running readings, by up to ${largest.toFixed(0)} degrees`,
      severity: 'warn',
      howSure: 'likely',
      checkFirst:
        'At the desk: whether the jumps come with one angle or with yaw moves. Then climb: plug, cable shield, track of a potentiometer.',
      ...rangeOf(days),
      detail: {
        spikes,
        readings: rows,
        largestDeg: largest,
        days: days.filter(({ vane }) => vane.spikes > 0).length,
      },
    },
  ])
}

function leadReport(days: readonly Day[]): SensorReport {
  const lead = (part: readonly Day[]): { moves: number; meanDeg: number } => {
    const moves = part.reduce((sum, { vane }) => sum + vane.moves, 0)
    return { moves, meanDeg: part.reduce((sum, { vane }) => sum + vane.leadSum, 0) / moves }
  }
  const whole = lead(days)
  if (whole.moves < FEW_MOVES) {
    return notTested(
      'vane',
      LEADS,
      `needs nacelle_position and ${FEW_MOVES} yaw moves in rows of 10 s or less; there are ${whole.moves}`,
    )
  }
  const note = `${whole.moves} yaw moves: the vane stood ${whole.meanDeg.toFixed(1)} degrees to their side in the minute before`
  for (let k = 1; k < days.length; k++) {
    const before = lead(days.slice(0, k))
    const after = lead(days.slice(k))
    if (before.moves < FEW_MOVES || after.moves < FEW_MOVES) continue
    if (!(before.meanDeg >= LEADS_DEG && after.meanDeg <= LEADS_NOT_DEG)) continue
    return tested('vane', LEADS, note, [
      leadFinding(
        `until ${iso(days[k]!.dayMs).slice(0, 10)} the vane stood ${before.meanDeg.toFixed(1)} degrees to the side of a yaw move in the minute before it, since then ${after.meanDeg.toFixed(1)}: it no longer leads the nacelle position`,
        { from: iso(days[k]!.dayMs), to: null },
        { beforeDeg: before.meanDeg, afterDeg: after.meanDeg, moves: whole.moves },
      ),
    ])
  }
  if (whole.meanDeg > LEADS_NOT_DEG) return tested('vane', LEADS, note)
  return tested('vane', LEADS, note, [
    leadFinding(
      `the vane stands ${whole.meanDeg.toFixed(1)} degrees to the side of a yaw move in the minute before it: yaw moves of the nacelle position do not follow this vane`,
      rangeOf(days),
      { meanDeg: whole.meanDeg, moves: whole.moves },
    ),
  ])
}

function leadFinding(
  finding: string,
  range: { from: string | null; to: string | null },
  detail: Record<string, unknown>,
): SensorFinding {
  return {
    sensor: 'vane',
    kind: 'no-longer-leads',
    finding,
    severity: 'warn',
    howSure: 'likely',
    checkFirst:
      'At the desk: which vane the controller steers by now, whether yaw is on manual or under a farm controller, and the sign of the logged vane.',
    ...range,
    detail,
  }
}

function sumOf(series: readonly Float64Array[]): Float64Array {
  const total = new Float64Array(series[0]?.length ?? 0)
  for (const values of series) values.forEach((value, i) => (total[i]! += value))
  return total
}

function rangeOf(days: readonly Day[]): { from: string; to: string } {
  return { from: iso(days[0]!.dayMs), to: iso(days.at(-1)!.dayMs + 86_400_000) }
}

function iso(ms: number): string {
  return new Date(ms).toISOString()
}
