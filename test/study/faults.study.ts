/**
 * How often is a fault found, how well is its start dated, and how often is a sound turbine warned of? Monte Carlo over
 * made-up farms of 8 turbines and 60 days that differ in weather, controller, sensors and layout; rows of 10 minutes, as the
 * log has them; the sheet is the program's own. Not part of `npm test`.
 *
 *   npm run study -- faults [farms]
 */
import type { ScoreSheet, SensorFinding, TurbineSheet } from '../../src/sheet/index.ts'
import { FAULTS, randomScenario, type Fault, type SimulatedFarm } from '../../src/simulate/index.ts'
import { FAULT_CASES, type FaultCase } from './fault-cases.ts'
import { sheetOf, withFaults } from './faulty-farms.ts'
import { cachedFarm } from './simulated-farms.ts'

const FIRST_SEED = 55200
const DAYS = 60
const DAY_S = 86_400
const TURBINES = 8
/** Faulty turbines at a time: most of a farm is sound. */
const AT_ONCE = 3
const YEAR_DAYS = 365.25

export const TABLE_HEAD =
  '| fault, 8 turbines, 60 days, rows of 10 minutes | size | tried | found | at warn or fault | start dated to, hours: median, largest |'

/** What came of the trials of one case. */
export class Tally {
  tried = 0
  found = 0
  warned = 0
  readonly errorsH: number[] = []

  add(found: Found | null): void {
    this.tried++
    if (!found) return
    this.found++
    if (found.warned) this.warned++
    if (found.errorH !== null) this.errorsH.push(found.errorH)
  }
}

export function newTally(): Tally {
  return new Tally()
}

/** Findings that ask for attention, as text. */
export function warningsOf(sheet: ScoreSheet): { turbine: string; name: string; text: string }[] {
  return sheet.turbines.flatMap(({ turbine, sensors }) =>
    sensors
      .filter(({ severity }) => severity !== 'info')
      .map(({ sensor, kind, severity, finding }) => ({
        turbine,
        name: `${sensor}: ${kind}`,
        text: `${severity}, ${sensor}: ${kind}: ${finding}`,
      })),
  )
}

export async function faultStudy(farms: number, print: (text: string) => void): Promise<void> {
  const tallies = FAULT_CASES.map(newTally)
  await soundFarms(farms, print)
  for (let k = 0; k < farms; k++) {
    const sound = soundFarm(k)
    for (const cases of inGroups(FAULT_CASES, k)) {
      await tryCases(sound, k, cases, (fault, i, found) => {
        tallies[i]!.add(found)
        if (!found) print(`<!-- missed: farm ${k}, turbine ${fault.turbine + 1}, ${fault.kind} -->`)
      })
    }
  }
  print(TABLE_HEAD)
  print('|---|---|---|---|---|---|')
  FAULT_CASES.forEach((one, i) => {
    print(lineOf(one, tallies[i]!))
  })
}

/** How often a sound turbine is warned of. */
export async function soundFarms(farms: number, print: (text: string) => void): Promise<void> {
  const alarms = new Map<string, number>()
  for (let k = 0; k < farms; k++) {
    for (const { turbine, name, text } of warningsOf(await sheetOf(soundFarm(k)))) {
      alarms.set(name, (alarms.get(name) ?? 0) + 1)
      print(`<!-- false alarm: farm ${k}, ${turbine}, ${text} -->`)
    }
  }
  const years = (farms * TURBINES * DAYS) / YEAR_DAYS
  const total = [...alarms.values()].reduce((sum, n) => sum + n, 0)
  print(
    `Sound turbines: ${years.toFixed(1)} turbine-years, ${total} findings at warn or fault, ${(total / years).toFixed(2)} a turbine-year` +
      (total > 0 ? ` (${[...alarms].map(([name, n]) => `${name} ${n}`).join(', ')})` : ''),
  )
}

function soundFarm(k: number): SimulatedFarm {
  return cachedFarm(randomScenario(FIRST_SEED + k, { turbines: TURBINES, days: DAYS }))
}

/** Groups of cases that are tried together, each at a turbine of its own; cases that chill the farm together. */
function inGroups(cases: readonly FaultCase[], farm: number): { index: number; turbine: number }[][] {
  const indices = [...cases.keys()]
  const chilling = indices.filter((i) => cases[i]!.kind.endsWith('-iced'))
  const others = indices.filter((i) => !chilling.includes(i))
  const groups = [chilling]
  for (let i = 0; i < others.length; i += AT_ONCE) groups.push(others.slice(i, i + AT_ONCE))
  return groups.map((group, g) =>
    group.map((index, j) => ({ index, turbine: (farm + g + 3 * j) % TURBINES })),
  )
}

async function tryCases(
  sound: SimulatedFarm,
  farm: number,
  group: readonly { index: number; turbine: number }[],
  tell: (fault: Fault, index: number, found: Found | null) => void,
): Promise<void> {
  const faults = group.map(({ index, turbine }): Fault => faultOf(FAULT_CASES[index]!, turbine, farm))
  const chills = faults.some(({ kind }) => kind.endsWith('-iced'))
  let made = sound
  if (chills) {
    made = cachedFarm(randomScenario(FIRST_SEED + farm, { turbines: TURBINES, days: DAYS, faults }))
  } else {
    for (const [j, fault] of faults.entries()) {
      const { vaneBits } = FAULT_CASES[group[j]!.index]!
      made = withFaults(made, fault.turbine, [fault], { vaneBits: vaneBits ?? sound.scenario.vaneBits })
    }
  }
  const sheet = await sheetOf(made)
  faults.forEach((fault, j) => {
    const { index } = group[j]!
    tell(fault, index, foundIn(sheet, fault, FAULT_CASES[index]!, made.scenario.startMs))
  })
}

function faultOf(one: FaultCase, turbine: number, farm: number): Fault {
  const fromS =
    one.fromDay === 0 ? 0 : one.fromDay * DAY_S + ((7 * farm + 11 * turbine) % 24) * 3600 + 60 * farm
  const toS = Math.min(fromS + one.days * DAY_S, DAYS * DAY_S)
  return {
    turbine,
    kind: one.kind,
    fromS,
    toS,
    ...(one.size === undefined ? {} : { size: one.size }),
    ...(one.place === undefined ? {} : { place: one.place }),
  }
}

/** A fault was found: whether at warn or fault, and how far off its start, hours; null: not dated. */
export interface Found {
  readonly warned: boolean
  readonly errorH: number | null
}

/** What the sheet has of a fault; null: nothing that fits. */
export function foundIn(sheet: ScoreSheet, fault: Fault, one: FaultCase, startMs: number): Found | null {
  const turbine = sheet.turbines[fault.turbine]!
  const fromMs = startMs + fault.fromS * 1000
  const toMs = startMs + fault.toS * 1000
  if (one.changesOffset) return changeIn(turbine, fromMs)
  const fitting = turbine.sensors.filter(
    (finding) =>
      one.sensors.includes(finding.sensor) &&
      one.findings.includes(finding.kind) &&
      startOf(finding) < toMs &&
      endOf(finding) > fromMs,
  )
  if (fitting.length === 0) return null
  const errors = fitting.map((finding) => Math.abs(startOf(finding) - fromMs) / 3_600_000)
  return {
    warned: fitting.some(({ severity }) => severity !== 'info'),
    errorH: one.dated ? Math.min(...errors) : null,
  }
}

function changeIn(turbine: TurbineSheet, fromMs: number): Found | null {
  const errors = turbine.staticOffset.changes.map(({ at }) => Math.abs(Date.parse(at) - fromMs) / 3_600_000)
  const errorH = Math.min(Infinity, ...errors)
  return errorH < 96 ? { warned: true, errorH } : null
}

/** A step says when it happened, or the first of several did; others say when they began. */
function startOf({ from, detail }: SensorFinding): number {
  const { at, steps } = detail as { at?: unknown; steps?: { at?: unknown }[] }
  const dated = at ?? (Array.isArray(steps) ? steps[0]?.at : undefined)
  if (typeof dated === 'string') return Date.parse(dated)
  return from === null ? -Infinity : Date.parse(from)
}

function endOf({ to }: SensorFinding): number {
  return to === null ? Infinity : Date.parse(to)
}

/** A line of the table. */
export function lineOf(one: FaultCase, { tried, found, warned, errorsH }: Tally): string {
  const described: { does: string; size?: { is: string; usual: number } } = FAULTS[one.kind]
  const size = described.size ? `${one.size ?? described.size.usual} ${described.size.is}` : ''
  const lasts = one.days === Infinity ? (one.fromDay === 0 ? '' : 'from then on') : `${24 * one.days} h`
  const sorted = [...errorsH].sort((a, b) => a - b)
  const dated =
    sorted.length > 0
      ? `${sorted[Math.floor(sorted.length / 2)]!.toFixed(1)}, ${sorted.at(-1)!.toFixed(1)}`
      : ''
  const share = (n: number) => `${((100 * n) / tried).toFixed(0)} %`
  return `| ${one.kind} | ${[size, lasts].filter((text) => text !== '').join(', ')} | ${tried} | ${share(found)} | ${share(warned)} | ${dated} |`
}
