import type { SensorSpell, TurbineFrame } from '../../frame/index.ts'
import type { SensorFinding } from '../../sheet/index.ts'
import { notTested, tested, type SensorReport } from './sensor-report.ts'
import { ICING_MAX_C } from './vane-frozen.ts'

const STUCK = 'stuck'
const ICED = 'iced over: reads low against neighbours near or below freezing'
/** What leans on the reading of this anemometer. */
export const SPOILS = [
  'static offset from own wind speed',
  'power curve',
  'energy loss',
  'neighbours’ comparison of anemometer responses',
]

/** Spells in which the anemometer kept one value while the turbine produced, or carried ice. Rows set aside as `sensor-fault`. */
export function anemometerStill(frame: TurbineFrame, turbines: number): SensorReport[] {
  const hasSpeed = frame.windSpeed.some((value) => !Number.isNaN(value))
  if (!hasSpeed) return [STUCK, ICED].map((test) => notTested('anemometer', test, 'needs wind_speed'))
  const hasAir = frame.airTemperature.some((value) => !Number.isNaN(value))
  const missing = [...(turbines < 3 ? ['3 turbines'] : []), ...(hasAir ? [] : ['air_temperature'])]
  return [
    tested(
      'anemometer',
      STUCK,
      `${frame.time.length} rows of ${frame.intervalS} s`,
      frame.spells.anemometerStuck.map(stuckFinding),
    ),
    missing.length > 0
      ? notTested('anemometer', ICED, `needs ${missing.join(' and ')}`)
      : tested(
          'anemometer',
          ICED,
          'own wind speed over the neighbours’ median, against what it is in warmer air; not seen when most of the farm ices at once',
          frame.spells.anemometerIced.map(icedFinding),
        ),
  ]
}

function stuckFinding(spell: SensorSpell): SensorFinding {
  const cold = spell.airTemperatureC <= ICING_MAX_C
  const hours = hoursOf(spell)
  const air = Number.isNaN(spell.airTemperatureC) ? '' : `, air ${spell.airTemperatureC.toFixed(1)} degrees C`
  return {
    sensor: 'anemometer',
    kind: cold && !spell.recordHeld ? 'icing' : 'frozen',
    finding: `the anemometer stood at ${spell.value.toFixed(2)} m/s for ${hours.toFixed(1)} hours while the turbine produced${air}${spell.recordHeld ? ': vane and power stood still too, so the record was held, not the anemometer alone' : ''}`,
    severity: 'warn',
    howSure: spell.recordHeld || cold ? 'likely' : 'certain',
    checkFirst: spell.recordHeld
      ? 'At the desk: ask for the logger’s communication alarms of that time.'
      : 'At the desk: read the anemometer live, its alarms and its heating. Then climb: bearing of the cups, plug, ice.',
    ...spanOf(spell),
    detail: { rows: spell.rows, hours, readMs: spell.value, setAside: 'sensor-fault', spoils: SPOILS },
  }
}

function icedFinding(spell: SensorSpell): SensorFinding {
  const hours = hoursOf(spell)
  return {
    sensor: 'anemometer',
    kind: 'icing',
    finding: `the anemometer read ${Math.round(100 * spell.value)} % of what it usually reads against its neighbours, for ${hours.toFixed(1)} hours at ${spell.airTemperatureC.toFixed(1)} degrees C: likely ice`,
    severity: 'warn',
    howSure: 'likely',
    checkFirst:
      'At the desk: icing alarms, humidity and the state of the anemometer’s heating at that time; compare with the second anemometer.',
    ...spanOf(spell),
    detail: {
      rows: spell.rows,
      hours,
      shareOfUsual: spell.value,
      airTemperatureC: spell.airTemperatureC,
      setAside: 'sensor-fault',
      judgedBy: 'own wind speed over the median of the neighbours; power plays no part',
      spoils: SPOILS,
    },
  }
}

function hoursOf(spell: SensorSpell): number {
  return (spell.toMs - spell.fromMs) / 3_600_000
}

function spanOf(spell: SensorSpell): { from: string; to: string } {
  return { from: new Date(spell.fromMs).toISOString(), to: new Date(spell.toMs).toISOString() }
}
