/**
 * One farm of 8 turbines over 60 days as an analyst may get it: a position sensor that slips by 24 degrees, a vane that
 * stands still twice, a vane that is knocked, and five sound turbines. Are they told apart, and are the sound ones left alone?
 */
import { randomScenario, type Fault } from '../../src/simulate/index.ts'
import { sheetOf, withFaults } from './faulty-farms.ts'
import { cachedFarm } from './simulated-farms.ts'

const FIRST_SEED = 88100
const DAY_S = 86_400
const HOUR_MS = 3_600_000
const SLIP_DEG = 24

export async function slippedAndFrozen(farms: number, print: (text: string) => void): Promise<void> {
  print(
    `| farm | slip of ${SLIP_DEG} found as | size, degrees | dated to, hours | frozen spells found | sound turbines at warn or fault |`,
  )
  print('|---|---|---|---|---|---|')
  for (let k = 0; k < farms; k++) {
    const sound = cachedFarm(randomScenario(FIRST_SEED + k, { turbines: 8, days: 60 }))
    const [slipped, still, knocked] = [k % 8, (k + 3) % 8, (k + 5) % 8] as const
    const slipS = 17 * DAY_S + ((7 * k + 3) % 24) * 3600 + 720
    const faults: Fault[] = [
      {
        turbine: slipped,
        kind: 'nacelle-shift',
        fromS: slipS,
        toS: 60 * DAY_S,
        size: k % 2 ? SLIP_DEG : -SLIP_DEG,
      },
      { turbine: still, kind: 'vane-frozen', fromS: (9.3 + k / 7) * DAY_S, toS: (9.75 + k / 7) * DAY_S },
      { turbine: still, kind: 'vane-frozen', fromS: (41 + k / 5) * DAY_S, toS: (42.4 + k / 5) * DAY_S },
      { turbine: knocked, kind: 'vane-knocked', fromS: 33.4 * DAY_S, toS: 60 * DAY_S, size: k % 2 ? -7 : 7 },
    ].map((fault) => ({ ...fault, fromS: whole(fault.fromS), toS: whole(fault.toS) }) as Fault)
    let farm = sound
    for (const turbine of [slipped, still, knocked]) {
      farm = withFaults(
        farm,
        turbine,
        faults.filter((fault) => fault.turbine === turbine),
      )
    }
    const { turbines } = await sheetOf(farm)
    const atMs = (second: number) => farm.scenario.startMs + second * 1000
    const steps = turbines[slipped]!.sensors.filter(({ kind }) => kind.endsWith('-step'))
    const [step] = steps
    const at = step?.detail['at']
    const errorH = typeof at === 'string' ? Math.abs(Date.parse(at) - atMs(whole(slipS))) / HOUR_MS : NaN
    const spells = faults.filter(({ kind }) => kind === 'vane-frozen')
    const found = spells.filter(({ fromS, toS }) =>
      turbines[still]!.sensors.some(
        ({ sensor, kind, from, to }) =>
          sensor === 'vane' &&
          (kind === 'frozen' || kind === 'icing') &&
          Date.parse(from ?? '') < atMs(toS) &&
          Date.parse(to ?? '') > atMs(fromS),
      ),
    )
    const alarms = turbines.flatMap(({ sensors }, i) =>
      [slipped, still, knocked].includes(i) ? [] : sensors.filter(({ severity }) => severity !== 'info'),
    )
    const size = step?.detail['sizeDeg']
    print(
      `| ${k + 1} | ${steps.map(({ kind }) => kind).join(', ') || 'nothing'} | ${typeof size === 'number' ? size.toFixed(1) : ''} | ${errorH.toFixed(1)} | ` +
        `${found.length} of ${spells.length} | ${alarms.length === 0 ? 'none' : alarms.map(({ sensor, kind }) => `${sensor} ${kind}`).join(', ')} |`,
    )
  }
}

/** Whole ten seconds, as the simulator takes faults up. */
function whole(second: number): number {
  return Math.round(second / 10) * 10
}
