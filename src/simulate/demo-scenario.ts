import type { Fault } from './faults.ts'
import type { FarmScenario } from './scenario.ts'

const DAY_S = 86_400
/** Second of the scenario at an hour (UTC) of a day of March. */
const march = (day: number, hour: number): number => (day - 1) * DAY_S + hour * 3600
const END_S = 31 * DAY_S

/** What goes wrong at Quern Hill, besides three vanes that are off. */
const FAULTS: readonly Fault[] = [
  // Ice holds the vane of the third turbine through a cold day.
  { turbine: 2, kind: 'vane-iced', fromS: march(5, 1), toS: march(5, 15) },
  // The position sensor of the fifth slips on its shaft.
  { turbine: 4, kind: 'nacelle-shift', fromS: march(12, 4), toS: END_S, size: 24 },
  // The anemometer of the first loses a tenth.
  { turbine: 0, kind: 'anemometer-gain', fromS: march(17, 9), toS: END_S, size: 0.9 },
  // The vane of the seventh loses its damping.
  { turbine: 6, kind: 'vane-noise', fromS: march(20, 11), toS: END_S, size: 3 },
  // The position counter of the second has no battery.
  { turbine: 1, kind: 'nacelle-zero-lost', fromS: 0, toS: END_S, size: 60 },
]

/** The month of data-demo/: eight turbines with honest anemometers, three vanes that are off, five faults, and a log with a few blemishes. */
export const DEMO_SCENARIO: Partial<FarmScenario> = {
  seed: 20260301,
  turbines: 8,
  days: 31,
  startMs: Date.UTC(2026, 2, 1),
  offsetsDeg: [0.4, -1.1, 0.8, 6.1, -0.3, -7.4, 1.6, 3.9],
  // 12 March, 09:00 to 15:30 UTC: the second turbine is held at 900 kW.
  limits: [{ turbine: 1, fromS: 11.375 * DAY_S, toS: 11.375 * DAY_S + 6.5 * 3600, limitKw: 900 }],
  faults: FAULTS,
  missingCells: 0.0004,
  brokenLines: 2,
}
