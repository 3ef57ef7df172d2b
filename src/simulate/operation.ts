import { PURPOSE, RandomStream } from './random.ts'
import type { Spell } from './faults.ts'
import type { FarmScenario, LimitSpell } from './scenario.ts'

export const STOP = { none: 0, fault: 1, maintenance: 2 } as const

/** What is ordered from outside, minute by minute from the first second of the window. */
export interface Orders {
  /** One of STOP. */
  stop: Uint8Array
  /** Set-point of power, kW; rated when there is none. */
  limitKw: Float64Array
}

/**
 * Stops and limits of one turbine. Drawn ones: a fault every 6 days or so of 2 h (median), maintenance every 20 days for
 * 2 to 6 h from the morning on, a limit of its own every 10 days for 1 to 5 h, and one for the whole farm every 15 days.
 */
export function turbineOrders(scenario: FarmScenario, turbine: number): Orders {
  const minutes = Math.ceil(scenario.days * 1440) + 1
  const orders: Orders = {
    stop: new Uint8Array(minutes),
    limitKw: new Float64Array(minutes).fill(scenario.ratedPowerKw),
  }
  // Each kind has a stream of its own: switching one off leaves the others, and a longer window begins like a shorter one.
  const own = (kind: number) => new RandomStream(scenario.seed, PURPOSE.operation, turbine, kind)
  const rated = scenario.ratedPowerKw
  const faults = spells(own(0), minutes, 6 * 1440, (stream) =>
    Math.min(120 * Math.exp(0.9 * stream.normal()), 2880),
  )
  const services = spells(own(1), minutes, 20 * 1440, (stream) => stream.between(120, 360)).map((spell) => {
    const fromMin = Math.floor(spell.fromMin / 1440) * 1440 + 7 * 60 + Math.floor(spell.size * 180)
    return { ...spell, fromMin, toMin: fromMin + spell.toMin - spell.fromMin }
  })
  const limits = [
    ...spells(own(2), minutes, 10 * 1440, (stream) => stream.between(60, 300)),
    ...spells(new RandomStream(scenario.seed, PURPOSE.farmLimits), minutes, 15 * 1440, (stream) =>
      stream.between(60, 240),
    ),
  ]
  if (scenario.stops === true) {
    for (const spell of faults) orders.stop.fill(STOP.fault, spell.fromMin, spell.toMin)
    for (const spell of services) orders.stop.fill(STOP.maintenance, spell.fromMin, spell.toMin)
  } else if (scenario.stops !== false) {
    for (const spell of mine(scenario.stops, turbine)) {
      orders.stop.fill(STOP.fault, Math.round(spell.fromS / 60), Math.round(spell.toS / 60))
    }
  }
  if (scenario.limits === true) {
    for (const spell of limits) {
      orders.limitKw.fill(Math.round((0.3 + 0.5 * spell.size) * rated), spell.fromMin, spell.toMin)
    }
  } else if (scenario.limits !== false) {
    for (const spell of mine<LimitSpell>(scenario.limits, turbine)) {
      orders.limitKw.fill(
        Math.min(spell.limitKw, rated),
        Math.round(spell.fromS / 60),
        Math.round(spell.toS / 60),
      )
    }
  }
  return orders
}

function mine<T extends Spell>(list: readonly T[], turbine: number): T[] {
  return list.filter((spell) => spell.turbine === turbine)
}

function spells(
  stream: RandomStream,
  minutes: number,
  gapMin: number,
  lengthMin: (stream: RandomStream) => number,
) {
  const list: { fromMin: number; toMin: number; size: number }[] = []
  let at = 0
  for (;;) {
    at += -gapMin * Math.log(1 - stream.uniform())
    if (!(at < minutes)) return list
    const fromMin = Math.floor(at)
    at += Math.max(10, lengthMin(stream))
    list.push({ fromMin, toMin: Math.floor(at), size: stream.uniform() })
  }
}
