/**
 * Faults that rows of 10 minutes hide, in rows of a second: how many are found in four days, and how often is a sound
 * turbine warned of? One turbine in three is faulty.
 */
import { randomScenario, simulateFarm } from '../../src/simulate/index.ts'
import { FAULT_CASES, type FaultCase } from './fault-cases.ts'
import { sheetOf, withFaults } from './faulty-farms.ts'
import { foundIn, lineOf, newTally, TABLE_HEAD, warningsOf } from './faults.study.ts'
import { cachedFarm } from './simulated-farms.ts'

const FIRST_SEED = 61400
const DAYS = 4
const TURBINES = 3

/** The cases of the other study that show within days, all from the start. */
const CASES: readonly FaultCase[] = FAULT_CASES.filter(({ kind }) =>
  /^yaw-|not-followed|stuck-bit|coarse-step|dead-sector|spikes|jumps/.test(kind),
).map((one) => ({ ...one, fromDay: 0, days: Infinity }))

export async function highRateFaults(farms: number, print: (text: string) => void): Promise<void> {
  const tallies = CASES.map(newTally)
  let alarms = 0
  let soundDays = 0
  for (let k = 0; k < farms; k++) {
    const given = { turbines: TURBINES, days: DAYS }
    const coarse = cachedFarm(randomScenario(FIRST_SEED + k, given))
    const fine = simulateFarm(randomScenario(FIRST_SEED + k, { ...given, rateS: 1 }))
    for (const { turbine, text } of warningsOf(await sheetOf(coarse, fine))) {
      alarms++
      print(`<!-- false alarm: farm ${k}, ${turbine}, ${text} -->`)
    }
    soundDays += TURBINES * DAYS
    for (const [i, one] of CASES.entries()) {
      const turbine = (k + i) % TURBINES
      const fault = {
        turbine,
        kind: one.kind,
        fromS: 0,
        toS: DAYS * 86_400,
        ...(one.size === undefined ? {} : { size: one.size }),
        ...(one.place === undefined ? {} : { place: one.place }),
      }
      const changes = { vaneBits: one.vaneBits ?? coarse.scenario.vaneBits }
      const sheet = await sheetOf(
        withFaults(coarse, turbine, [fault], changes),
        withFaults(fine, turbine, [fault], changes, false),
      )
      const found = foundIn(sheet, fault, one, coarse.scenario.startMs)
      tallies[i]!.add(found)
      if (!found) print(`<!-- missed: farm ${k}, turbine ${turbine + 1}, ${one.kind} -->`)
    }
  }
  print(
    TABLE_HEAD.replace(
      '8 turbines, 60 days, rows of 10 minutes',
      `3 turbines, ${DAYS} days, rows of a second`,
    ),
  )
  print('|---|---|---|---|---|---|')
  CASES.forEach((one, i) => {
    print(lineOf(one, tallies[i]!))
  })
  print(`\nSound turbines: ${soundDays} turbine-days, ${alarms} findings at warn or fault`)
}
