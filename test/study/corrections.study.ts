/**
 * Are corrections told for what they are? Simulated farms of nine over 90 days, one turbine 6 degrees off the wind, 6 degrees
 * entered on day 45: with the right sign, with the wrong one, not at all; with nacelle position in the log and by power
 * alone; after some days and at the end. The truth of the gain is the same turbine in the same weather left as it was. Not
 * part of `npm test`; about two minutes a farm.
 *
 *   npm run study -- corrections [farms]
 */
import { createHash } from 'node:crypto'
import { existsSync, mkdirSync, readFileSync, writeFileSync } from 'node:fs'
import { join } from 'node:path'
import v8 from 'node:v8'
import {
  compareNeighbours,
  dayBlocks,
  headingSteps,
  proveCorrections,
  signChecks,
} from '../../src/analysis/index.ts'
import type { CorrectionProof } from '../../src/sheet/index.ts'
import { farmScenario, type FarmScenario, type SimulatedFarm } from '../../src/simulate/index.ts'
import { turbineInflow } from '../../src/simulate/inflow.ts'
import { turbineOrders } from '../../src/simulate/operation.ts'
import { emptyRows, STATES, type TurbineRows } from '../../src/simulate/rows.ts'
import { runTurbine } from '../../src/simulate/run-turbine.ts'
import { planTurbines } from '../../src/simulate/turbine-plan.ts'
import { farmWeather } from '../../src/simulate/weather.ts'
import { CACHE, cachedFarm, frameOf, simulator, STUDY_SETTINGS } from './simulated-farms.ts'

const FIRST_SEED = 45_000
const TURBINES = 9
const DAYS = 90
const DAY = 45
const DAY_MS = 86_400_000
const ENTERED_DEG = 6
/** Turbines of each farm that are corrected, one at a time. */
const TARGETS = [0, 4, 8]
const AFTER_DAYS = [1, 2, 10, 45] as const
/** True wind speeds over which the truth of a gain is taken, m/s: about those that are compared. */
const BELOW_RATED_MS = [5, 10.8] as const

const CASES = [
  { name: 'right', addedDeg: 6 },
  { name: 'wrong sign', addedDeg: -6 },
  { name: 'not entered', addedDeg: 0 },
] as const

interface Line {
  readonly name: string
  readonly position: boolean
  readonly afterDays: number
  readonly outcomes: Map<string, number>
  readonly errors: number[]
  readonly halves: number[]
  readonly headings: number[]
  readonly predictions: number[]
  covered: number
  placebos: number
  beyond: number
}

export function correctionStudy(farms: number, print: (text: string) => void): void {
  const lines: Line[] = []
  for (let k = 0; k < farms; k++) farmCases(FIRST_SEED + k, lines)
  print(
    '| entered | nacelle position | days after | outcomes | heading half-width, degrees | gain: RMSE, % | half-width, % | truth in the interval | predicted less true, % | placebos beyond chance |',
  )
  print('|---|---|---|---|---|---|---|---|---|---|')
  for (const line of lines) print(lineText(line))
}

function farmCases(seed: number, lines: Line[]): void {
  const scenario = farmScenario({
    seed,
    turbines: TURBINES,
    days: DAYS,
    offsetsDeg: Array.from({ length: TURBINES }, (_, i) => (TARGETS.includes(i) ? ENTERED_DEG : (i % 3) - 1)),
    anemometerResponsePerDeg: -0.003,
    anemometerResponseSpread: 0.0003,
  })
  const base = cachedFarm(scenario)
  for (const target of TARGETS) {
    for (const one of CASES) {
      const farm = one.addedDeg === 0 ? base : withCorrection(base, target, one.addedDeg)
      const truth = trueGainPct(base, farm, target)
      for (const position of [true, false]) {
        for (const afterDays of AFTER_DAYS) {
          let line = lines.find(
            (other) =>
              other.name === one.name && other.position === position && other.afterDays === afterDays,
          )
          if (!line) {
            line = {
              name: one.name,
              position,
              afterDays,
              outcomes: new Map(),
              errors: [],
              halves: [],
              headings: [],
              predictions: [],
              covered: 0,
              placebos: 0,
              beyond: 0,
            }
            lines.push(line)
          }
          note(line, proofOf(farm, target, { position, afterDays }), truth)
        }
      }
    }
  }
}

function note(line: Line, proof: CorrectionProof, truthPct: number): void {
  line.outcomes.set(proof.outcome, (line.outcomes.get(proof.outcome) ?? 0) + 1)
  line.placebos += proof.placebos.list.length
  line.beyond += proof.placebos.beyondChance
  const [from, to] = proof.heading.interval95Deg
  if (typeof from === 'number' && typeof to === 'number') line.headings.push((to - from) / 2)
  const [low, high] = proof.interval95Pct
  if (proof.gainPct === null || typeof low !== 'number' || typeof high !== 'number') return
  line.errors.push(proof.gainPct - truthPct)
  line.halves.push((high - low) / 2)
  if (low <= truthPct && truthPct <= high) line.covered++
  if (proof.predictedPct !== null) line.predictions.push(proof.predictedPct - truthPct)
}

function lineText(line: Line): string {
  const rms = (values: readonly number[]): number =>
    Math.sqrt(values.reduce((sum, value) => sum + value * value, 0) / values.length)
  const mean = (values: readonly number[]): number =>
    values.reduce((sum, value) => sum + value, 0) / values.length
  const outcomes = [...line.outcomes].sort((a, b) => b[1] - a[1]).map(([name, count]) => `${name} ${count}`)
  const cells = [
    line.name,
    line.position ? 'yes' : 'no',
    line.afterDays,
    outcomes.join(', '),
    mean(line.headings).toFixed(1),
    rms(line.errors).toFixed(2),
    mean(line.halves).toFixed(2),
    `${line.covered} of ${line.errors.length}`,
    line.name === 'right' ? mean(line.predictions).toFixed(2) : '',
    `${line.beyond} of ${line.placebos}`,
  ]
  return `| ${cells.join(' | ')} |`
}

/** The farm with one turbine run anew in the same weather, with a correction from the day on. */
function withCorrection(base: SimulatedFarm, target: number, addedDeg: number): SimulatedFarm {
  const scenario: FarmScenario = {
    ...base.scenario,
    corrections: [{ turbine: target, atS: DAY * 86_400, recordedDeg: ENTERED_DEG, addedDeg }],
  }
  const key = createHash('sha256')
    .update(simulator())
    .update(JSON.stringify([scenario, target]))
    .digest('hex')
  const file = join(CACHE, `${key.slice(0, 24)}.turbine.bin`)
  let rows: TurbineRows
  if (existsSync(file)) rows = v8.deserialize(readFileSync(file)) as TurbineRows
  else {
    const plans = planTurbines(scenario)
    const orders = plans.map((plan) => turbineOrders(scenario, plan.index))
    const inflow = turbineInflow(scenario, farmWeather(scenario), plans, orders, target)
    rows = emptyRows(scenario.startMs, scenario.rateS, (scenario.days * 86_400) / scenario.rateS)
    runTurbine(scenario, plans[target]!, inflow, orders[target]!, rows)
    mkdirSync(CACHE, { recursive: true })
    writeFileSync(file, v8.serialize(rows))
  }
  const old = base.turbines[target]!
  const { air_temperature, air_pressure } = old.columns
  const turbine = {
    ...old,
    ...rows,
    columns: { ...rows.columns, air_temperature, air_pressure },
    status: Array.from(rows.state, (code) => STATES[code]!),
  }
  return { scenario, turbines: base.turbines.map((one, i) => (i === target ? turbine : one)) }
}

/** Energy after the day against that of the turbine left alone, over unlimited rows below rated, %. */
function trueGainPct(base: SimulatedFarm, farm: SimulatedFarm, target: number): number {
  const left = base.turbines[target]!
  const changed = farm.turbines[target]!
  let made = 0
  let without = 0
  for (let row = (DAY * 86_400) / base.scenario.rateS; row < left.timeMs.length; row++) {
    if (STATES[left.state[row]!] !== 'run' || STATES[changed.state[row]!] !== 'run') continue
    const wind = left.trueRotorWindMs[row]!
    if (!(wind >= BELOW_RATED_MS[0] && wind <= BELOW_RATED_MS[1])) continue
    made += changed.columns.power[row]!
    without += left.columns.power[row]!
  }
  return 100 * (made / without - 1)
}

function proofOf(
  farm: SimulatedFarm,
  target: number,
  { position, afterDays }: { position: boolean; afterDays: number },
): CorrectionProof {
  const whole = afterDays + DAY >= DAYS
  const settings = {
    ...STUDY_SETTINGS,
    resamples: 200,
    assumedResponsePctPerDeg: whole && position ? null : -0.3,
  }
  const rows = ((DAY + afterDays) * 86_400) / farm.scenario.rateS
  const cut: SimulatedFarm = {
    ...farm,
    turbines: farm.turbines.map((turbine) => ({
      ...turbine,
      timeMs: turbine.timeMs.slice(0, rows),
      status: turbine.status.slice(0, rows),
      columns: Object.fromEntries(
        Object.entries(turbine.columns).map(([name, values]) => [
          name,
          name === 'nacelle_position' && !position ? new Float64Array(rows).fill(NaN) : values.slice(0, rows),
        ]),
      ) as typeof turbine.columns,
    })),
  }
  const frame = frameOf(cut, settings)
  const days = frame.calendar.days
  const dayWeights = dayBlocks(days, settings)
  const neighbours = whole && position ? compareNeighbours(frame, days, dayWeights, settings) : null
  const [proof] = proveCorrections({
    farm: frame,
    days,
    dayWeights,
    settings,
    corrections: [
      {
        turbine: farm.turbines[target]!.turbine,
        at: new Date(farm.scenario.startMs + DAY * DAY_MS).toISOString(),
        enteredDeg: ENTERED_DEG,
      },
    ],
    events: [],
    headings: headingSteps(frame),
    responses: frame.turbines.map((_, i) => neighbours?.response.turbines[i] ?? null),
    blocked: signChecks(frame).map(({ block }) => block !== null),
  })
  return proof!
}
