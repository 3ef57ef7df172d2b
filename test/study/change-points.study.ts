/**
 * How well are changes of an offset found and dated? Monte Carlo over simulated farms of 8 turbines and 60 days in which one
 * vane is knocked by 7 degrees; the anemometers are honest (a constant response cancels in changes). Not part of `npm test`.
 *
 *   npm run study -- changes [farms]
 */
import { headingSteps } from '../../src/analysis/changes/offset-changes-heading.ts'
import { offsetChanges, type OffsetHistory } from '../../src/analysis/changes/offset-changes.ts'
import { farmScenario, type FarmScenario, type SimulatedFarm } from '../../src/simulate/index.ts'
import { cachedFarm, frameOf, STUDY_SETTINGS } from './simulated-farms.ts'

const FIRST_SEED = 7310
const DAY_MS = 86_400_000
const SETTINGS = { ...STUDY_SETTINGS, assumedResponsePctPerDeg: 0 }
/** Day and size of the knock. */
const KNOCK_DAY = 32
const KNOCK_DEG = 7
const OFFSETS_DEG = [0.4, -5.2, 1.1, 4.3, -0.9, 6.8, 0.2, -3.6]
/** Slips of a position sensor that are put on an untouched turbine of the same log, on another day. */
const SLIP_DAY = 20
const SLIPS_DEG = [4, -7, 120]

/** Farm k of 8 turbines and 60 days: one vane is knocked by 7 degrees, one way or the other, on day 33. */
export function knockedFarm(k: number): FarmScenario {
  const offsetsDeg = OFFSETS_DEG.map((_, i) => OFFSETS_DEG[(i + k) % OFFSETS_DEG.length]!)
  const turbine = (3 * k) % offsetsDeg.length
  return farmScenario({
    seed: FIRST_SEED + k,
    turbines: offsetsDeg.length,
    days: 60,
    offsetsDeg,
    offsetChanges: [
      {
        turbine,
        atS: KNOCK_DAY * 86400 + (((5 * k + 3) * 3600) % 86400),
        toDeg: offsetsDeg[turbine]! + (k % 2 === 0 ? KNOCK_DEG : -KNOCK_DEG),
        entered: false,
      },
    ],
  })
}

export function changeStudy(farms: number, print: (text: string) => void): void {
  const heading = new Tally()
  const power = new Tally()
  const slips = new Map(SLIPS_DEG.map((slip) => [slip, new Tally()]))
  for (let k = 0; k < farms; k++) {
    const farm = cachedFarm(knockedFarm(k))
    heading.add(farm, historiesOf(farm, true))
    power.add(farm, historiesOf(farm, false))
    for (const [slip, tally] of slips) {
      const slipped = (farm.scenario.offsetChanges[0]!.turbine + 1 + (k % 7)) % farm.turbines.length
      tally.add(withSlip(farm, slipped, slip), historiesOf(withSlip(farm, slipped, slip), true), slipped)
    }
  }
  print(
    '| 8 turbines, 60 days, one vane knocked by 7 | knocks | found | date error, hours: median, largest | size error, degrees: rms, largest | ' +
      'date in its interval | size in its interval | offset after: rms error | untouched turbines | with a false change | slips | told as such |',
  )
  print('|---|---|---|---|---|---|---|---|---|---|---|---|')
  print(heading.line('with nacelle position'))
  print(power.line('power alone'))
  for (const [slip, tally] of slips) print(tally.line(`and a position sensor that slips by ${slip}`))
}

function historiesOf(farm: SimulatedFarm, withHeading: boolean): OffsetHistory[] {
  const frame = frameOf(farm, SETTINGS)
  const records = withHeading ? headingSteps(frame) : []
  return frame.turbines.map((turbine, i) =>
    offsetChanges({
      turbine,
      days: frame.calendar.days,
      exponent: farm.scenario.exponent,
      heading: records[i] ?? null,
    }),
  )
}

function withSlip(farm: SimulatedFarm, turbine: number, slipDeg: number): SimulatedFarm {
  const turbines = farm.turbines.map((one, i) => {
    if (i !== turbine) return one
    const from = farm.scenario.startMs + SLIP_DAY * DAY_MS
    const position = one.columns.nacelle_position.map((value, row) =>
      one.timeMs[row]! >= from ? (((value + slipDeg) % 360) + 360) % 360 : value,
    )
    return { ...one, columns: { ...one.columns, nacelle_position: position } }
  })
  return { ...farm, turbines }
}

class Tally {
  readonly #hours: number[] = []
  readonly #sizes: number[] = []
  readonly #after: number[] = []
  #knocks = 0
  #dated = 0
  #sized = 0
  #untouched = 0
  #false = 0
  #slips = 0
  #told = 0

  add(farm: SimulatedFarm, histories: readonly OffsetHistory[], slipped = -1): void {
    const knock = farm.scenario.offsetChanges[0]!
    const atMs = farm.scenario.startMs + knock.atS * 1000
    const sizeDeg = knock.toDeg - farm.scenario.offsetsDeg![knock.turbine]!
    histories.forEach(({ changes, segments, positionSteps }, i) => {
      if (i !== knock.turbine) {
        this.#untouched++
        if (changes.length > 0) this.#false++
        if (i === slipped) {
          this.#slips++
          if (positionSteps.length === 1 && changes.length === 0) this.#told++
        } else if (positionSteps.length > 0) this.#false++
        return
      }
      this.#knocks++
      const [change, ...more] = changes
      if (!change) return
      if (more.length > 0) this.#false++
      this.#hours.push(Math.abs(change.atMs - atMs) / 3_600_000)
      this.#sizes.push(change.sizeDeg - sizeDeg)
      this.#after.push(segments.at(-1)!.offsetDeg - knock.toDeg)
      if (change.interval[0] <= atMs && atMs <= change.interval[1]) this.#dated++
      const [low, high] = change.sizeInterval95Deg
      if (low <= sizeDeg && sizeDeg <= high) this.#sized++
    })
  }

  line(name: string): string {
    const hours = [...this.#hours].sort((a, b) => a - b)
    const cells = [
      name,
      this.#knocks,
      hours.length,
      `${hours[Math.floor(hours.length / 2)]!.toFixed(1)}, ${hours.at(-1)!.toFixed(1)}`,
      `${rms(this.#sizes).toFixed(2)}, ${Math.max(...this.#sizes.map(Math.abs)).toFixed(2)}`,
      this.#dated,
      this.#sized,
      rms(this.#after).toFixed(2),
      this.#untouched,
      this.#false,
      this.#slips,
      this.#told,
    ]
    return `| ${cells.join(' | ')} |`
  }
}

function rms(values: readonly number[]): number {
  return Math.sqrt(values.reduce((sum, value) => sum + value * value, 0) / values.length)
}
