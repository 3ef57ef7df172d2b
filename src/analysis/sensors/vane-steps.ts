import { wrap180 } from '../../kernel/angle/index.ts'
import type { TurbineFrame } from '../../frame/index.ts'
import type { SensorFinding } from '../../sheet/index.ts'
import { notTested, tested, type SensorReport } from './sensor-report.ts'
import { angleStep, codeCounts, deadSector, stuckBit, type AngleStep } from './vane-codes.ts'

const STEP_TEST = 'step size, and whether it coarsened'
const BIT_TEST = 'stuck bit of an encoder'
const SECTOR_TEST = 'dead sector of a potentiometer'
/** A step from which it is told, and one with which no offset can be judged; degrees. */
const TOLD_DEG = 1.2
const COARSE_DEG = 5
const DAY_MS = 86_400_000
/** Days on either side of a date at which the step changed. */
const FEW_DAYS = 3
const SECTOR_BINS = 180
/** Visits of angles astern and abeam without which no dead sector can be seen. */
const FEW_VISITS = 1500

/** Single readings of a vane: values with their times; degrees. */
export interface VaneReadings {
  readonly time: Float64Array
  readonly values: Float64Array
  readonly source: string
}

/** Lowest and highest readings of the intervals, which are readings and no means; else the vane itself. */
export function readingsOf(frame: TurbineFrame): VaneReadings {
  const { time, vaneMin, vaneMax, vaneRead } = frame
  const hasExtremes = vaneMin.some((value) => !Number.isNaN(value))
  if (!hasExtremes) return { time, values: vaneRead, source: 'the logged vane' }
  return {
    time: Float64Array.from({ length: 2 * time.length }, (_, k) => time[k >> 1]!),
    values: Float64Array.from({ length: 2 * time.length }, (_, k) =>
      wrap180((k % 2 === 0 ? vaneMin : vaneMax)[k >> 1]!),
    ),
    source: 'vane_min and vane_max',
  }
}

/** Step, stuck bit and dead sector from the angles that a vane was ever seen at. */
export function vaneSteps(frame: TurbineFrame): SensorReport[] {
  if (frame.vaneSource !== 'vane') {
    return [STEP_TEST, BIT_TEST, SECTOR_TEST].map((test) => notTested('vane', test, 'needs a logged vane'))
  }
  const readings = readingsOf(frame)
  const step = angleStep(readings.values)
  const sensorStep = step.bits !== null || step.decimalsDeg >= 0.5
  const range = {
    from: new Date(frame.time[0]!).toISOString(),
    to: new Date(frame.time.at(-1)! + frame.intervalS * 1000).toISOString(),
  }
  return [
    stepReport(readings, step, sensorStep, range),
    bitReport(readings, step, range),
    sectorReport(frame, range),
  ]
}

type Range = Pick<SensorFinding, 'from' | 'to'>

function stepReport(
  readings: VaneReadings,
  step: AngleStep,
  sensorStep: boolean,
  range: Range,
): SensorReport {
  const coarsened = coarsenedAt(readings)
  if (!sensorStep && !coarsened) {
    return notTested(
      'vane',
      STEP_TEST,
      `the log gives ${Number.isNaN(step.decimalsDeg) ? 'no step' : `steps of ${step.decimalsDeg} degrees`}; the sensor’s own step does not show in means: needs vane_min and vane_max, or high-rate rows`,
    )
  }
  const findings: SensorFinding[] = []
  if (coarsened) {
    findings.push({
      sensor: 'vane',
      kind: 'coarse-step',
      finding: `from ${coarsened.date} on the vane reads in steps of ${coarsened.afterDeg.toFixed(2)} degrees, before in steps of ${coarsened.beforeDeg.toFixed(2)}: a lost bit, or another resolution of encoder or logger`,
      severity: 'warn',
      howSure: 'certain',
      checkFirst:
        'At the desk: whether vane, converter or logging was changed on that day; then the raw word of the encoder while the vane is turned.',
      from: coarsened.date + 'T00:00:00.000Z',
      to: range.to,
      detail: { beforeDeg: coarsened.beforeDeg, afterDeg: coarsened.afterDeg },
    })
  } else if (step.stepDeg >= TOLD_DEG) {
    const coarse = step.stepDeg >= COARSE_DEG
    findings.push({
      sensor: 'vane',
      kind: 'coarse-step',
      finding: `the vane reads in steps of ${step.stepDeg.toFixed(2)} degrees${step.bits === null ? '' : ` (${step.bits} bits)`}${coarse ? ': too coarse for an offset of a few degrees' : ''}`,
      severity: coarse ? 'warn' : 'info',
      howSure: 'certain',
      checkFirst: 'At the desk: resolution of the vane by its data sheet, and of the channel in the logger.',
      ...range,
      detail: { stepDeg: step.stepDeg, bits: step.bits, codesSeen: step.codes },
    })
  }
  return tested('vane', STEP_TEST, `${readings.source}: step ${step.stepDeg.toFixed(3)} degrees`, findings)
}

/** The first day from which on the step is twice as wide or more; null when there is none. */
function coarsenedAt({
  time,
  values,
}: VaneReadings): { date: string; beforeDeg: number; afterDeg: number } | null {
  const days: { ms: number; stepDeg: number }[] = []
  for (let from = 0; from < time.length;) {
    const day = Math.floor(time[from]! / DAY_MS)
    let to = from
    while (to < time.length && Math.floor(time[to]! / DAY_MS) === day) to++
    const { stepDeg } = angleStep(values.subarray(from, to))
    if (stepDeg > 0) days.push({ ms: day * DAY_MS, stepDeg })
    from = to
  }
  for (let k = FEW_DAYS; k <= days.length - FEW_DAYS; k++) {
    const before = Math.max(...days.slice(k - FEW_DAYS, k).map(({ stepDeg }) => stepDeg))
    const after = Math.min(...days.slice(k).map(({ stepDeg }) => stepDeg))
    if (after >= 1.9 * before && after >= 0.5) {
      return { date: new Date(days[k]!.ms).toISOString().slice(0, 10), beforeDeg: before, afterDeg: after }
    }
  }
  return null
}

function bitReport(readings: VaneReadings, step: AngleStep, range: Range): SensorReport {
  if (step.bits === null) {
    return notTested(
      'vane',
      BIT_TEST,
      'needs single readings of an encoder: vane_min and vane_max of one, or high-rate rows',
    )
  }
  const found = stuckBit(codeCounts(readings.values, step.stepDeg))
  return tested(
    'vane',
    BIT_TEST,
    `${readings.source}: ${step.codes} codes of ${step.bits} bits`,
    found ? [stuckBitFinding(found, step.bits, range)] : [],
  )
}

export function stuckBitFinding(
  found: { binaryBit: number; gaps: number; expected: number; seen: number },
  bits: number,
  range: Range,
): SensorFinding {
  const gray = found.binaryBit > 0 ? `, or bit ${found.binaryBit - 1} of a Gray word` : ''
  return {
    sensor: 'vane',
    kind: 'stuck-bit',
    finding: `bit ${found.binaryBit} (0 = finest) of the vane’s ${bits}-bit word never changes${gray}: every other block of ${2 ** found.binaryBit} codes is missing, ${found.gaps} blocks in the midst of common angles`,
    severity: 'fault',
    howSure: 'likely',
    checkFirst:
      'At the desk: watch the raw word of the encoder while the vane turns. Then the line of that bit at the converter, and its plug.',
    ...range,
    detail: {
      binaryBit: found.binaryBit,
      grayBit: found.binaryBit > 0 ? found.binaryBit - 1 : null,
      bits,
      missingReadingsExpected: Math.round(found.expected),
      seen: found.seen,
    },
  }
}

function sectorReport(frame: TurbineFrame, range: Range): SensorReport {
  const { vaneRead, vaneMin, vaneMax } = frame
  const visits = new Float64Array(SECTOR_BINS)
  let total = 0
  let wide = 0
  for (const series of [vaneRead, vaneMin, vaneMax]) {
    let last = -1
    for (const value of series) {
      if (Number.isNaN(value)) continue
      const bin = Math.floor((wrap180(value) + 180) / (360 / SECTOR_BINS))
      if (bin !== last) {
        visits[bin]!++
        total++
        if (Math.abs(wrap180(value)) > 30) wide++
      }
      last = bin
    }
  }
  // A sensor of coarse steps leaves bins of two degrees empty in between.
  const { stepDeg } = angleStep(readingsOf(frame).values)
  if (stepDeg >= 1) {
    return notTested(
      'vane',
      SECTOR_TEST,
      `the vane reads in steps of ${stepDeg.toFixed(2)} degrees: needs a finer one`,
    )
  }
  const found = deadSector(visits)
  const note = `${total} visits of angles by 2 degrees, ${wide} of them more than 30 degrees off the axis`
  if (found) return tested('vane', SECTOR_TEST, note, [deadSectorFinding(found, range)])
  if (wide >= FEW_VISITS) return tested('vane', SECTOR_TEST, note)
  return notTested(
    'vane',
    SECTOR_TEST,
    `${note}: no gap ahead; needs stops in wind, or high-rate rows, for the sides and the rear`,
  )
}

export function deadSectorFinding(
  found: { fromDeg: number; toDeg: number; expected: number },
  range: Range,
): SensorFinding {
  const middle = wrap180((found.fromDeg + found.toDeg) / 2)
  const ahead = Math.abs(middle) <= 90
  return {
    sensor: 'vane',
    kind: 'dead-sector',
    finding: `the vane never reads ${wrap180(found.fromDeg).toFixed(0)} to ${wrap180(found.toDeg).toFixed(0)} degrees, though both sides of it are common (about ${Math.round(found.expected)} readings would be due)${ahead ? '' : ': the gap of a potentiometer, harmless so far astern'}`,
    severity: ahead ? 'warn' : 'info',
    howSure: 'likely',
    checkFirst:
      'At the desk: kind of the vane and where its gap lies by the drawing. Then turn it by hand through that sector and watch the reading.',
    ...range,
    detail: { fromDeg: wrap180(found.fromDeg), toDeg: wrap180(found.toDeg), expected: found.expected },
  }
}
