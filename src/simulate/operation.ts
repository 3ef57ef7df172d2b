import { PURPOSE, RandomStream } from './random.ts'
import type { FarmScenario, LimitSpell, Spell } from './scenario.ts'

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
  const stream = new RandomStream(scenario.seed, PURPOSE.operation, turbine)
  const farm = new RandomStream(scenario.seed, PURPOSE.farmLimits)
  const rated = scenario.ratedPowerKw
  // Every draw is made whatever is switched on, so that switching one kind off leaves the others.
  const faults = spells(stream, minutes, 6 * 1440, () =>
    Math.min(120 * Math.exp(0.9 * stream.normal()), 2880),
  )
  const services = spells(stream, minutes, 20 * 1440, () => stream.between(120, 360)).map((spell) => {
    const fromMin = Math.floor(spell.fromMin / 1440) * 1440 + 7 * 60 + Math.floor(stream.between(0, 180))
    return { ...spell, fromMin, toMin: fromMin + spell.toMin - spell.fromMin }
  })
  const limits = [
    ...spells(stream, minutes, 10 * 1440, () => stream.between(60, 300)),
    ...spells(farm, minutes, 15 * 1440, () => farm.between(60, 240)),
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

function spells(stream: RandomStream, minutes: number, gapMin: number, lengthMin: () => number) {
  const list: { fromMin: number; toMin: number; size: number }[] = []
  let at = 0
  for (;;) {
    at += -gapMin * Math.log(1 - stream.uniform())
    if (!(at < minutes)) return list
    const fromMin = Math.floor(at)
    at += Math.max(10, lengthMin())
    list.push({ fromMin, toMin: Math.floor(at), size: stream.uniform() })
  }
}
