import { wrap180 } from '../../kernel/angle/index.ts'
import { medianOf } from '../../kernel/stats/index.ts'
import type { NacelleNorth, SensorTest, TurbineSheet } from '../../sheet/index.ts'
import type { YawDay } from '../yaw-activity/yaw-day.ts'
import type { NacelleRecord } from './nacelle-records.ts'

/** What ties the farm's consensus to true north. */
export interface TrueNorth {
  readonly source: 'wakes' | 'surveyed'
  /** To be added to n - d against the consensus to get it against true north, degrees. */
  readonly shiftDeg: number
  /** At 95 %, degrees. */
  readonly halfWidthDeg: number
  readonly note: string
}

const NOTES = {
  compared:
    'against the consensus of the farm, whose own north is not known; nacelle plus vane can show n - d only, n is that plus the offset d of the vane',
  'zero-lost': 'the position takes another zero again and again: the last piece holds until the next one',
  unrelated: 'the position has nothing to do with the wind that the other turbines see',
  reversed: 'vane or position has the wrong sign: their sum is no direction',
  alone: 'at least three turbines with position and vane are needed, with days in common',
  missing: 'no nacelle position in the log',
} as const satisfies Record<NacelleNorth['state'], string>

/** North of one turbine as the sheet shows it; n by adding the offset d of its vane with its interval. */
export function nacelleNorth(
  record: NacelleRecord,
  offset: Pick<TurbineSheet['staticOffset'], 'estimateDeg' | 'interval95Deg'>,
  days: readonly YawDay[] = [],
): NacelleNorth {
  const last = record.levels.at(-1)
  const level = last ? { deg: last.deg, halfWidthDeg: last.halfWidthDeg } : null
  const north = level && plusOffset(level.deg, level.halfWidthDeg, offset)
  return {
    state: record.state,
    northMinusVaneOffsetDeg: level?.deg ?? null,
    interval95Deg: level ? about(level.deg, level.halfWidthDeg) : [null, null],
    northOffsetDeg: north?.deg ?? null,
    northInterval95Deg: north?.interval ?? [null, null],
    pieces: record.levels.map(({ fromMs, toMs, deg, halfWidthDeg }) => ({
      from: new Date(fromMs).toISOString(),
      to: new Date(toMs).toISOString(),
      northMinusVaneOffsetDeg: deg,
      interval95Deg: about(deg, halfWidthDeg),
    })),
    absolute: null,
    resolutionDeg: resolutionOf(record, days),
    note: NOTES[record.state],
  }
}

/** The same with the consensus tied to true north. */
export function withTrueNorth(sheet: TurbineSheet, north: TrueNorth | null): NacelleNorth {
  const { nacelle } = sheet
  if (!north || nacelle.northMinusVaneOffsetDeg === null) return nacelle
  const deg = wrap180(nacelle.northMinusVaneOffsetDeg + north.shiftDeg)
  const [low, high] = nacelle.interval95Deg
  const half = Math.hypot(north.halfWidthDeg, ((high ?? NaN) - (low ?? NaN)) / 2 || 0)
  const own = plusOffset(deg, half, sheet.staticOffset)
  return {
    ...nacelle,
    absolute: {
      source: north.source,
      northMinusVaneOffsetDeg: deg,
      interval95Deg: about(deg, half),
      northOffsetDeg: own.deg,
      northInterval95Deg: own.interval,
      note: north.note,
    },
  }
}

/** Tests of the nacelle position that the log allowed. */
export function nacelleTests(record: NacelleRecord): SensorTest[] {
  const done = record.state === 'compared' || record.state === 'zero-lost'
  const note = done ? 'nacelle position plus vane against the other turbines' : NOTES[record.state]
  return [
    {
      sensor: 'nacelle-position',
      test: 'north against the farm; steps; zero lost; slow slip; missing pulses',
      done,
      note,
    },
    {
      sensor: 'nacelle-position',
      test: 'stuck reading; jumps faster than the yaw drive turns',
      done: done || record.state === 'unrelated',
      note,
    },
  ]
}

function plusOffset(
  deg: number,
  halfWidthDeg: number,
  offset: Pick<TurbineSheet['staticOffset'], 'estimateDeg' | 'interval95Deg'>,
): { deg: number | null; interval: (number | null)[] } {
  const d = offset.estimateDeg
  const [low, high] = offset.interval95Deg
  if (d === null || Number.isNaN(d)) return { deg: null, interval: [null, null] }
  const north = wrap180(deg + d)
  if (low === null || low === undefined || high === null || high === undefined)
    return { deg: north, interval: [null, null] }
  return {
    deg: north,
    interval: [north - Math.hypot(halfWidthDeg, d - low), north + Math.hypot(halfWidthDeg, high - d)],
  }
}

function about(deg: number, halfWidthDeg: number): (number | null)[] {
  return Number.isNaN(halfWidthDeg) ? [null, null] : [deg - halfWidthDeg, deg + halfWidthDeg]
}

/** Step of the reading: from rows of seconds where there are some. */
function resolutionOf(record: NacelleRecord, days: readonly YawDay[]): number | null {
  const steps = days.map(({ stepDeg }) => stepDeg).filter((step) => step > 0)
  if (steps.length > 0) return medianOf(steps)
  return Number.isNaN(record.resolutionDeg) ? null : record.resolutionDeg
}
