import { farmScenario, type FarmScenario } from '../../src/simulate/index.ts'

const FIRST_SEED = 7310
/** Day and size of the knock. */
const KNOCK_DAY = 32
const KNOCK_DEG = 7
const OFFSETS_DEG = [0.4, -5.2, 1.1, 4.3, -0.9, 6.8, 0.2, -3.6]

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
