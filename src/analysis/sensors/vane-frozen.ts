import { medianOf, robustSd } from '../../kernel/stats/index.ts'
import { wrap180 } from '../../kernel/angle/index.ts'
import type { SensorSpell, TurbineFrame } from '../../frame/index.ts'
import type { SensorFinding } from '../../sheet/index.ts'
import { notTested, tested, type SensorReport } from './sensor-report.ts'

/** Up to this air temperature a frozen sensor is likely to carry ice, degrees C. Common practice, no source. */
export const ICING_MAX_C = 2
/** A spell this long cannot be overlooked by whoever reads the log. */
const LONG_MS = 24 * 3_600_000
const TEST = 'frozen or iced over'

/**
 * Each spell in which the vane kept one value while the wind blew. Its rows are set aside as `sensor-fault`.
 *
 * @param others  the other turbines of the farm at the same time: what their vanes did meanwhile.
 */
export function vaneFrozen(frame: TurbineFrame, others: readonly TurbineFrame[]): SensorReport {
  if (frame.vaneSource !== 'vane') return notTested('vane', TEST, 'needs a logged vane')
  const hasSd = frame.vaneSd.some((value) => !Number.isNaN(value))
  return tested(
    'vane',
    TEST,
    `${frame.time.length} rows of ${frame.intervalS} s, ${hasSd ? 'with' : 'without'} the SD inside the interval`,
    frame.spells.vaneFrozen.map((spell) => findingOf(spell, frame, others)),
  )
}

function findingOf(spell: SensorSpell, frame: TurbineFrame, others: readonly TurbineFrame[]): SensorFinding {
  const inside = (time: Float64Array) => (_: number, i: number) =>
    time[i]! >= spell.fromMs && time[i]! < spell.toMs
  const wind = frame.windSpeed.filter(inside(frame.time)).filter((value) => !Number.isNaN(value))
  const windSpan = [Math.min(...wind), Math.max(...wind)] as const
  const othersMoved = medianOf(
    others.map((other) => {
      const vane = other.vane.filter(inside(other.time))
      const centre = vane.find((value) => !Number.isNaN(value)) ?? NaN
      return robustSd(vane.map((value) => wrap180(value - centre)))
    }),
  )
  const cold = spell.airTemperatureC <= ICING_MAX_C
  const hours = (spell.toMs - spell.fromMs) / 3_600_000
  const air = Number.isNaN(spell.airTemperatureC)
    ? ''
    : ` and air of ${spell.airTemperatureC.toFixed(1)} degrees C`
  const meanwhile =
    othersMoved > 0
      ? `; the vanes of its neighbours moved by ${othersMoved.toFixed(1)} degrees (SD) meanwhile`
      : ''
  const stood = `the vane stood at ${spell.value.toFixed(1)} degrees for ${hours.toFixed(1)} hours in wind of ${windSpan[0].toFixed(1)} to ${windSpan[1].toFixed(1)} m/s${air}${meanwhile}`
  const cause = spell.recordHeld
    ? ': wind speed and power stood still too, so the record was held, not the vane alone'
    : cold
      ? ': likely ice'
      : ''
  return {
    sensor: 'vane',
    kind: cold && !spell.recordHeld ? 'icing' : 'frozen',
    finding: stood + cause,
    severity: !cold && !spell.recordHeld && spell.toMs - spell.fromMs >= LONG_MS ? 'fault' : 'warn',
    howSure: spell.recordHeld || cold ? 'likely' : 'certain',
    checkFirst: spell.recordHeld
      ? 'At the desk: ask for the logger’s communication alarms of that time.'
      : cold
        ? 'At the desk: icing alarms, humidity and the state of the vane heating at that time; read the heating current. Climb only when it does not heat.'
        : 'At the desk: read the vane live while the turbine yaws, and its supply and alarms of that time. Then climb: bearing, coupling, plug.',
    from: new Date(spell.fromMs).toISOString(),
    to: new Date(spell.toMs).toISOString(),
    detail: {
      rows: spell.rows,
      hours,
      readDeg: spell.value,
      airTemperatureC: numberOrNull(spell.airTemperatureC),
      windSpeedMs: wind.length > 0 ? [...windSpan] : [null, null],
      neighboursVaneSdDeg: numberOrNull(othersMoved),
      setAside: 'sensor-fault',
    },
  }
}

function numberOrNull(value: number): number | null {
  return Number.isFinite(value) ? value : null
}
