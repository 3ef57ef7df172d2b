import type { Command } from 'commander'
import { Type } from 'typebox'
import { InputError } from '../errors.ts'
import { checkShape } from '../setup/index.ts'
import {
  DEMO_SCENARIO,
  farmScenario,
  randomScenario,
  writeSimulation,
  type FarmScenario,
} from '../simulate/index.ts'
import { parseCorrection, parseFault } from './fault-options.ts'
import type { CommandParts } from './parts.ts'

export interface SimulateFlags {
  out: string
  turbines: string
  days: string
  seed: string
  rate: string
  name?: string
  start?: string
  random?: boolean
  demo?: boolean
  fault: string[]
  correction: string[]
  vaneLogged?: FarmScenario['vaneLogged']
}

/** Ranges are those of the scenario, which says what it expected; here text becomes numbers. */
const Flags = Type.Object({
  '--turbines': Type.Integer(),
  '--days': Type.Number(),
  '--seed': Type.Integer(),
  '--rate': Type.Integer(),
  '--name': Type.Optional(Type.String({ pattern: '^[a-z0-9][a-z0-9-]{0,60}$' })),
  '--start': Type.Optional(Type.String({ format: 'date' })),
})

/** Writes a made-up farm and says where its files lie. */
export async function simulateCommand(
  flags: SimulateFlags,
  command: Command,
  parts: CommandParts,
): Promise<void> {
  const written = await writeSimulation(scenarioOf(flags, command), flags.out)
  parts.stdout.write(
    [
      'Invented data: a made-up wind farm in made-up weather.',
      `log    ${written.logPath}`,
      `site   ${written.sitePath}`,
      `truth  ${written.truthPath}`,
      `Score it:  yawledger replay ${written.logPath} --site ${written.sitePath} --out ${flags.out}`,
      '',
    ].join('\n'),
  )
}

function scenarioOf(flags: SimulateFlags, command: Command): Partial<FarmScenario> {
  if (flags.demo === true) {
    const given = command.options.find(
      (option) =>
        !['out', 'demo', 'logLevel'].includes(option.attributeName()) &&
        command.getOptionValueSource(option.attributeName()) === 'cli',
    )
    if (given !== undefined)
      throw new InputError('BAD_OPTION', `--demo: expected no ${given.long!} beside it, got one`)
    return DEMO_SCENARIO
  }
  const typed = {
    '--turbines': flags.turbines,
    '--days': flags.days,
    '--seed': flags.seed,
    '--rate': flags.rate,
    ...(flags.name === undefined ? {} : { '--name': flags.name }),
    ...(flags.start === undefined ? {} : { '--start': flags.start }),
  }
  const checked = checkShape(Flags, typed, { code: 'BAD_OPTION', place: '', fromText: true })
  const overrides: Partial<FarmScenario> = {
    seed: checked['--seed'],
    turbines: checked['--turbines'],
    days: checked['--days'],
    rateS: checked['--rate'],
  }
  if (checked['--name'] !== undefined) overrides.site = checked['--name']
  if (checked['--start'] !== undefined) overrides.startMs = Date.parse(`${checked['--start']}T00:00:00Z`)
  if (flags.vaneLogged !== undefined) overrides.vaneLogged = flags.vaneLogged
  const place = farmScenario(overrides)
  overrides.faults = flags.fault.map((text) => parseFault(text, place))
  overrides.corrections = flags.correction.map((text) => parseCorrection(text, place))
  return flags.random === true ? randomScenario(checked['--seed'], overrides) : overrides
}
