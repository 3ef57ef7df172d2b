import { faultsOf } from './faults.ts'
import { PURPOSE, RandomStream } from './random.ts'
import { scenarioSeconds, type FarmScenario } from './scenario.ts'

/** What one turbine is, once drawn. */
export interface TurbinePlan {
  index: number
  name: string
  /** d of the controller's vane at the start, degrees. */
  offsetDeg: number
  correctionDeg: number
  responsePerDeg: number
  anemometerGain: number
  northOffsetDeg: number
  eastingM: number
  northingM: number
}

/** Names of the turbines, in order. */
export function turbineNames({ prefix, turbines }: Pick<FarmScenario, 'prefix' | 'turbines'>): string[] {
  return Array.from({ length: turbines }, (_, index) => prefix + String(index + 1).padStart(2, '0'))
}

/** Draws each turbine's own values from streams of its own: a further turbine changes none of them. */
export function planTurbines(scenario: FarmScenario): TurbinePlan[] {
  return turbineNames(scenario).map((name, index) => {
    const setup = new RandomStream(scenario.seed, PURPOSE.setup, index)
    const responsePerDeg =
      scenario.anemometerResponsePerDeg + scenario.anemometerResponseSpread * setup.normal()
    const anemometerGain = 1 + scenario.anemometerGainSpread * setup.normal()
    const northOffsetDeg = index % 5 < 2 ? 3 * setup.normal() : setup.between(-180, 180)
    return {
      index,
      name,
      offsetDeg: scenario.offsetsDeg?.[index] ?? drawOffset(scenario.seed, index),
      correctionDeg: scenario.correctionsDeg?.[index] ?? 0,
      responsePerDeg,
      anemometerGain,
      northOffsetDeg: scenario.northOffsetsDeg?.[index] ?? northOffsetDeg,
      ...position(scenario, index),
    }
  })
}

function drawOffset(seed: number, index: number): number {
  const stream = new RandomStream(seed, PURPOSE.offset, index)
  if (index % 2 === 0) return 1.2 * stream.normal()
  return (stream.uniform() < 0.5 ? -1 : 1) * stream.between(3, 9)
}

/** Staggered rows with some metres of disorder; the first turbine stands near the origin. */
function position(scenario: FarmScenario, index: number): { eastingM: number; northingM: number } {
  const { columns, spacingD, rowSpacingD, bearingDeg } = scenario.layout
  const stream = new RandomStream(scenario.seed, PURPOSE.position, index)
  const row = Math.floor(index / columns)
  const along =
    ((index % columns) + (row % 2) / 2) * spacingD * scenario.rotorDiameterM + 30 * stream.normal()
  const across = row * rowSpacingD * scenario.rotorDiameterM + 30 * stream.normal()
  const bearing = (bearingDeg * Math.PI) / 180
  return {
    eastingM: Math.round(along * Math.sin(bearing) + across * Math.cos(bearing)),
    northingM: Math.round(along * Math.cos(bearing) - across * Math.sin(bearing)),
  }
}

/** The offset of a controller's vane takes another value. */
export interface OffsetStep {
  atS: number
  toDeg: number
  /** Degrees that the controller adds to its vane from then on; the rest of the change is at the vane itself. */
  addedDeg: number
  /** Degrees that the site file says were added; null: it says nothing. */
  recordedDeg: number | null
}

/** The changes of one turbine's offset, in order of time: knocks, corrections, and what the scenario says outright. */
export function offsetSteps(scenario: FarmScenario, plan: TurbinePlan): OffsetStep[] {
  type Event = { atS: number; after: (beforeDeg: number) => Omit<OffsetStep, 'atS'> }
  const mine = ({ turbine }: { turbine: number }) => turbine === plan.index
  const knocked = (atS: number, byDeg: number): Event => ({
    atS,
    after: (beforeDeg) => ({ toDeg: beforeDeg - byDeg, addedDeg: 0, recordedDeg: null }),
  })
  const events: Event[] = [
    ...scenario.offsetChanges.filter(mine).map(({ atS, toDeg, entered }): Event => ({
      atS,
      after: (beforeDeg) => ({
        toDeg,
        addedDeg: entered ? beforeDeg - toDeg : 0,
        recordedDeg: entered ? beforeDeg - toDeg : null,
      }),
    })),
    ...scenario.corrections.filter(mine).map(({ atS, addedDeg, recordedDeg }): Event => ({
      atS,
      after: (beforeDeg) => ({ toDeg: beforeDeg - addedDeg, addedDeg, recordedDeg }),
    })),
    ...faultsOf(scenario.faults, plan.index)
      .filter(({ kind }) => kind === 'vane-knocked')
      .flatMap(({ fromS, toS, size }) => [knocked(fromS, size!), knocked(toS, -size!)]),
  ]
  let offsetDeg = plan.offsetDeg
  return events
    .filter(({ atS }) => atS < scenarioSeconds(scenario))
    .sort((a, b) => a.atS - b.atS)
    .map(({ atS, after }) => {
      const step = { atS, ...after(offsetDeg) }
      offsetDeg = step.toDeg
      return step
    })
}
