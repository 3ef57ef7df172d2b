/**
 * How well are faults of a nacelle position found, and how often is a healthy one blamed? Monte Carlo over simulated farms
 * unlike each other, of 8 turbines and 60 days; faults are put into the logged position of one turbine after another. Not
 * part of `npm test`.
 *
 *   npm run study -- north [farms]
 */
import { lastSegment, nacelleFindings, nacelleRecords, type NacelleRecord } from '../../src/analysis/index.ts'
import { createRandom } from '../../src/kernel/stats/index.ts'
import { randomScenario, type SimulatedFarm } from '../../src/simulate/index.ts'
import type { SensorFinding } from '../../src/sheet/index.ts'
import { cachedFarm, frameOf, STUDY_SETTINGS } from './simulated-farms.ts'

const FIRST_SEED = 8410
const DAYS = 60
const SETTINGS = { ...STUDY_SETTINGS, assumedResponsePctPerDeg: 0 }

/** The logged position, in place of the true one. */
type Fault = (positionDeg: Float64Array, farm: SimulatedFarm, turbine: number, seed: number) => Float64Array

const ROWS_PER_DAY = 144
const slipAt =
  (row: number, deg: number): Fault =>
  (position) =>
    position.map((value, i) => wrap(i >= row ? value + deg : value))

const FAULTS: readonly (readonly [name: string, kinds: readonly SensorFinding['kind'][], fault: Fault])[] = [
  ['a slip of 24 degrees', ['position-step'], (...all) => slipAt(3000 + (all[3] % 2000), 24)(...all)],
  [
    'a slip of 6 degrees',
    ['position-step', 'unexplained-step'],
    (...all) => slipAt(3000 + (all[3] % 2000), 6)(...all),
  ],
  [
    'a slip of 128 degrees in a gap of three hours',
    ['position-step'],
    (position, farm, turbine, seed) => {
      const row = 3000 + (seed % 2000)
      return slipAt(row, 128)(position, farm, turbine, seed).map((value, i) =>
        i >= row - 9 && i < row + 9 ? NaN : value,
      )
    },
  ],
  [
    'zero lost after nearly every stop',
    ['zero-lost'],
    (position, farm, turbine, seed) => {
      const random = createRandom(seed, 1)
      const { status } = farm.turbines[turbine]!
      let shift = 0
      return position.map((value, i) => {
        const starts = status[i] === 'run' && i > 0 && status[i - 1] !== 'run'
        if (starts && random.below(100) < 85) shift = random.below(340) - 170
        return wrap(value + shift)
      })
    },
  ],
  [
    'a slip of half a degree a day over 30 days',
    ['slow-slip'],
    (position) =>
      position.map((value, i) => wrap(value + 0.5 * Math.max(0, Math.min(30, i / ROWS_PER_DAY - 20)))),
  ],
  [
    'stuck for two days',
    ['frozen'],
    (position, _farm, _turbine, seed) => {
      const from = 3000 + (seed % 2000)
      return position.map((value, i) => (i >= from && i < from + 288 ? position[from]! : value))
    },
  ],
  [
    'noise',
    ['not-usable'],
    (position, _f, _t, seed) => {
      const random = createRandom(seed, 2)
      return position.map(() => random.below(360))
    },
  ],
]

export function northStudy(farms: number, print: (text: string) => void): void {
  const healthy = new Map<string, number>()
  let turbineYears = 0
  const found = FAULTS.map(() => 0)
  const hours: number[][] = FAULTS.map(() => [])
  const others = FAULTS.map(() => 0)
  for (let k = 0; k < farms; k++) {
    const farm = cachedFarm(randomScenario(FIRST_SEED + k, { days: DAYS, turbines: 8 }))
    turbineYears += (8 * DAYS) / 365.25
    for (const { kind, severity } of findingsOf(farm).flat()) {
      const name = `${kind} (${severity})`
      healthy.set(name, (healthy.get(name) ?? 0) + 1)
    }
    FAULTS.forEach(([, kinds, fault], f) => {
      const turbine = (k + f) % 8
      const findings = findingsOf(withFault(farm, turbine, fault, 37 * k + 101 * f))
      const own = findings[turbine]!.filter(({ severity }) => severity !== 'info')
      if (own.length === 1 && kinds.includes(own[0]!.kind)) found[f]!++
      else
        print(
          `<!-- ${FAULTS[f]![0]}, farm ${k}: ${own.map(({ kind, finding }) => `${kind}: ${finding}`).join(' | ')} -->`,
        )
      const at = own.find(({ kind }) => kinds.includes(kind))?.detail['at']
      if (typeof at === 'string') {
        const truth = farm.scenario.startMs + (3000 + ((37 * k + 101 * f) % 2000)) * 600_000
        hours[f]!.push(Math.abs(Date.parse(at) - truth) / 3_600_000)
      }
      others[f]! += findings.filter(
        (list, i) => i !== turbine && list.some(({ severity }) => severity !== 'info'),
      ).length
    })
  }
  print(`${farms} farms of 8 turbines, ${DAYS} days: ${turbineYears.toFixed(1)} healthy turbine-years`)
  print(`findings on healthy turbines: ${JSON.stringify(Object.fromEntries(healthy))}`)
  print(
    '| fault of one turbine | told as such, and nothing else | date error, hours: median, largest | other turbines blamed |',
  )
  print('|---|---|---|---|')
  FAULTS.forEach(([name], f) => {
    const sorted = hours[f]!.sort((a, b) => a - b)
    const dates =
      sorted.length > 0 ? `${sorted[sorted.length >> 1]!.toFixed(1)}, ${sorted.at(-1)!.toFixed(1)}` : ''
    print(`| ${name} | ${found[f]!} of ${farms} | ${dates} | ${others[f]!} of ${7 * farms} |`)
  })
}

function findingsOf(farm: SimulatedFarm): SensorFinding[][] {
  const frame = frameOf(farm, SETTINGS)
  const { turbines } = nacelleRecords(frame, [])
  return frame.turbines.map((turbine, i) => {
    const record: NacelleRecord = turbines[i]!
    const segment = lastSegment(turbine, {
      days: frame.calendar.days,
      usedDays: new Set(turbine.day.filter((_, row) => turbine.reason[row] === 0)).size,
      exponent: 3,
      heading: record.heading,
      events: [],
    })
    return nacelleFindings(turbine, record, segment)
  })
}

function withFault(farm: SimulatedFarm, turbine: number, fault: Fault, seed: number): SimulatedFarm {
  const turbines = farm.turbines.map((one, i) =>
    i === turbine
      ? {
          ...one,
          columns: { ...one.columns, nacelle_position: fault(one.columns.nacelle_position, farm, i, seed) },
        }
      : one,
  )
  return { ...farm, turbines }
}

function wrap(angleDeg: number): number {
  return ((angleDeg % 360) + 360) % 360
}
