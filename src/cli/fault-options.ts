import { InputError } from '../errors.ts'
import {
  FAULT_KINDS,
  FAULTS,
  turbineNames,
  type Correction,
  type Fault,
  type FarmScenario,
  type FaultKind,
} from '../simulate/index.ts'

const TIME = String.raw`\d{4}-\d{2}-\d{2}(?:T\d{2}:\d{2}(?::\d{2})?Z)?`
const NUMBER = String.raw`-?\d+(?:\.\d+)?`
const FAULT = new RegExp(`^([^:]+):([a-z-]+):(${TIME}):(${TIME})(?::(${NUMBER}))?(?::(${NUMBER}))?$`)
const CORRECTION = new RegExp(`^([^:]+):(${TIME}):(${NUMBER})(?::(right|wrong-sign|not-entered))?$`)

type Place = Pick<FarmScenario, 'prefix' | 'turbines' | 'startMs'>

/**
 * A fault as it is written behind `--fault`: TURBINE:KIND:FROM:TO[:SIZE[:PLACE]], times in UTC. The kind may be
 * shortened to an end that only one kind has: `frozen`.
 *
 * @throws InputError BAD_OPTION
 */
export function parseFault(text: string, scenario: Place): Fault {
  const parts = FAULT.exec(text)
  if (!parts) {
    throw new InputError(
      'BAD_OPTION',
      `--fault: expected TURBINE:KIND:FROM:TO[:SIZE[:PLACE]] such as Q03:frozen:2026-03-05:2026-03-08T06:00Z, got ${JSON.stringify(text)}`,
    )
  }
  const [, turbine = '', kind = '', from = '', to = '', size, place] = parts
  return {
    turbine: turbineIndex('--fault', turbine, scenario),
    kind: kindOf(kind),
    fromS: secondOf(from, scenario),
    toS: secondOf(to, scenario),
    ...(size === undefined ? {} : { size: Number(size) }),
    ...(place === undefined ? {} : { place: Number(place) }),
  }
}

/**
 * A correction as it is written behind `--correction`: TURBINE:AT:DEGREES[:right|wrong-sign|not-entered]. The site file
 * names it in any case.
 *
 * @throws InputError BAD_OPTION
 */
export function parseCorrection(text: string, scenario: Place): Correction {
  const parts = CORRECTION.exec(text)
  if (!parts) {
    throw new InputError(
      'BAD_OPTION',
      `--correction: expected TURBINE:AT:DEGREES[:right|wrong-sign|not-entered] such as Q04:2026-03-15T10:00Z:6, got ${JSON.stringify(text)}`,
    )
  }
  const [, turbine = '', at = '', degrees = '', how = 'right'] = parts
  const recordedDeg = Number(degrees)
  return {
    turbine: turbineIndex('--correction', turbine, scenario),
    atS: secondOf(at, scenario),
    recordedDeg,
    addedDeg: how === 'right' ? recordedDeg : how === 'wrong-sign' ? -recordedDeg : 0,
  }
}

/** The kinds with what they do and what their numbers are, for the help. */
export function faultsHelp(): string {
  return FAULT_KINDS.map((kind) => {
    const fault: {
      does: string
      size?: { is: string; usual: number }
      place?: { is: string; usual: number }
    } = FAULTS[kind]
    const numbers = (['size', 'place'] as const).flatMap((name) => {
      const amount = fault[name]
      return amount ? [`${name.toUpperCase()}: ${amount.is} (${amount.usual})`] : []
    })
    return `  ${kind.padEnd(24)}${[fault.does, ...numbers].join('; ')}`
  }).join('\n')
}

function kindOf(text: string): FaultKind {
  const exact = FAULT_KINDS.find((kind) => kind === text)
  if (exact) return exact
  const ends = FAULT_KINDS.filter((kind) => kind.endsWith(`-${text}`))
  if (ends.length === 1) return ends[0]!
  const choice = ends.length > 1 ? ends : FAULT_KINDS
  throw new InputError('BAD_OPTION', `--fault: expected one of ${choice.join(', ')}, got "${text}"`)
}

function turbineIndex(flag: string, name: string, scenario: Place): number {
  const names = turbineNames(scenario)
  const index = names.indexOf(name)
  if (index >= 0) return index
  throw new InputError(
    'BAD_OPTION',
    `${flag}: expected a turbine of ${names[0]!} to ${names.at(-1)!}, got "${name}"`,
  )
}

function secondOf(time: string, { startMs }: Place): number {
  const ms = Date.parse(time)
  if (Number.isNaN(ms)) throw new InputError('BAD_OPTION', `time: expected a date that exists, got "${time}"`)
  return (ms - startMs) / 1000
}
