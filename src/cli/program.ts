import { Command, Option } from 'commander'
import { faultsHelp } from './fault-options.ts'
import type { CommandParts, SettingFlags } from './parts.ts'
import { replayCommand, type ReplayFlags } from './replay-command.ts'
import { sweepCommand, type SweepFlags } from './sweep-command.ts'
import { simulateCommand, type SimulateFlags } from './simulate-command.ts'

const UNITS = `Degrees, m/s, kW, MWh; a time is the start of its interval, and stamps without a zone are UTC unless --timezone tells.
A positive misalignment m: the nacelle must stand m degrees further clockwise, seen from above; m is added to the vane reading.`

const EXIT_CODES = `Exit status: 0 done, 1 failed, 2 wrong use.`

/** The settings that have a flag of their own: flag -> setting. */
const SETTING_FLAGS = {
  host: 'host',
  port: 'port',
  data: 'dataFolder',
  database: 'databaseUrl',
  exponent: 'exponent',
  assumeResponse: 'assumedResponsePctPerDeg',
  resamples: 'resamples',
  seed: 'seed',
  threshold: 'actionThresholdDeg',
  threads: 'scoreThreads',
  logLevel: 'logLevel',
} as const

/**
 * The commands, their flags and their help. Nothing runs before `parseAsync`.
 *
 * @param setStatus  told the exit status of a command that ran to its end with another one than 0.
 */
export function buildProgram(parts: CommandParts, setStatus: (status: number) => void): Command {
  const program = new Command('yawledger')
    .description('Replays wind-turbine SCADA yaw logs and scores misalignment.')
    .version(parts.version)
    .exitOverride()
    .showHelpAfterError('Run with --help to see what is taken.')
    .configureOutput({
      writeOut: (text) => parts.stdout.write(text),
      writeErr: (text) => parts.stderr.write(text),
      outputError: (text, write) => {
        write(text.replace(/^error: /, 'error BAD_OPTION: '))
      },
    })
    .addHelpText(
      'after',
      `
Examples:
  yawledger replay march.csv.gz --site farm.site.json --out out/march
  yawledger replay march.csv --timezone Europe/Berlin | jq '.worklist'
  yawledger simulate --out made-up --turbines 8 --days 30
  yawledger serve --port 8080 --data ./data
  yawledger sweep --all --month 2026-03 --data ./data

${UNITS}
${EXIT_CODES}`,
    )
  addServe(program, parts)
  addReplay(program, parts)
  addSweep(program, parts, setStatus)
  addSimulate(program, parts)
  return program
}

function addServe(program: Command, parts: CommandParts): void {
  const serve = program
    .command('serve')
    .description('Run the service: logs are posted to /v1/replays, /openapi.json describes the rest.')
    .option('--host <address>', 'address to listen on; 0.0.0.0 for all')
    .option('--port <number>', 'port to listen on')
    .option('--data <folder>', 'folder that keeps the replays')
    .addOption(logLevelOption())
    .addHelpText(
      'after',
      `
Examples:
  yawledger serve --port 8080 --data ./data
  curl --data-binary @march.csv -H "Content-Type: text/csv" http://127.0.0.1:8080/v1/replays

Settings, from the environment (a flag wins over it):
${parts.settingsHelp}
${EXIT_CODES}`,
    )
  serve.action(async (flags: Record<string, string>) => {
    await parts.serve(settingFlags(flags, serve))
  })
}

function addReplay(program: Command, parts: CommandParts): void {
  const replay = program
    .command('replay')
    .description('Score log files without a service.')
    .argument('<log...>', 'CSV files, plain or .gz; - reads standard input')
    .option('--site <file>', 'site file (JSON): turbines, rated power, time zone, corrections')
    .option(
      '--out <folder>',
      'write score-sheet.json there and print a summary; default: the sheet on standard output',
    )
    .option('--rows <file>', 'write every row with the reason it was set aside: .csv, .parquet or .arrow')
    .option('--dry-run', 'print how the logs would be read, and score nothing')
    .option('--format <list>', 'json, csv: what is written to --out', 'json')
    .option('--timezone <zone>', 'IANA zone of stamps without an offset, such as Europe/Berlin')
    .option('--stamp <edge>', 'begin or end: which edge of its interval a time stamp marks')
    .option('--columns <json>', 'JSON or a file with it: canonical channel -> column of the log')
    .option('--turbine <name>', 'name of the turbine when the log has no turbine column')
    .option('--start-date <date>', 'date of the lowest day number, for logs with a day number and a clock')
    .option('--date-order <order>', 'ymd, dmy or mdy, where written dates leave it open')
    .option('--rated-power <kW>', 'rated power of turbines whose site file gives none')
    .option('--exponent <p>', 'power follows the power curve at u cos(g)^(p/3); 3 unless set')
    .option('--assume-response <pct>', 'response of the anemometer to the vane, % per degree, taken as known')
    .option('--resamples <n>', 'resamples of the day bootstrap')
    .option('--seed <n>', 'seed of the day bootstrap')
    .option('--threshold <degrees>', 'misalignment from which someone should act')
    .option('--threads <n>', 'worker threads that score turbines')
    .option('--set <name=value>', 'any other setting, such as windMinMs=6; may be repeated', collect, [])
    .addOption(logLevelOption())
    .addHelpText(
      'after',
      `
Examples:
  yawledger replay march.csv.gz --site farm.site.json --out out/march --format json,csv
  yawledger replay a.csv b.csv --timezone Europe/Berlin --rated-power 2300 > sheet.json
  zcat old.csv.gz | yawledger replay - --columns '{"wind_speed": "Wspd", "power": {"column": "P", "unit": "W"}}'

Canonical channels: time, turbine, wind_speed, vane, nacelle_position, wind_direction, power, power_limit, pitch,
rotor_speed, air_temperature, air_pressure, status, ...; usual header names are recognised without --columns.

${UNITS}
${EXIT_CODES}`,
    )
  replay.action(async (logs: string[], flags: ReplayFlags & Record<string, string>) => {
    await replayCommand(logs, flags, settingFlags(flags, replay), parts)
  })
}

function addSweep(program: Command, parts: CommandParts, setStatus: (status: number) => void): void {
  const sweep = program
    .command('sweep')
    .description('Score the stored logs of whole sites and print who to climb first: the scheduled job.')
    .option('--site <name...>', 'sites to score')
    .option('--all', 'score every site of the data folder')
    .option('--month <yyyy-mm>', 'the month to score, in the time zone of each site')
    .option('--from <time>', 'first moment; without an offset in the time zone of each site')
    .option('--to <time>', 'first moment after the window')
    .option('--data <folder>', 'folder that a service has stored the logs in; no service may use it now')
    .option('--exponent <p>', 'power follows the power curve at u cos(g)^(p/3); 3 unless set')
    .option('--threshold <degrees>', 'misalignment from which someone should act')
    .option('--threads <n>', 'worker threads that score turbines')
    .option('--set <name=value>', 'any other setting, such as windMinMs=6; may be repeated', collect, [])
    .addOption(logLevelOption())
    .addHelpText(
      'after',
      `
Examples:
  yawledger sweep --all --month 2026-03 --data ./data
  yawledger sweep --site quern-hill --from 2026-03-01 --to 2026-06-01 --data ./data

The sheets are kept, and a service on the same folder answers them. A site that fails does not stop the others.
Exit status: 0 nothing to do, 10 someone should climb, 1 a site failed, 2 wrong use.`,
    )
  sweep.action(async (flags: SweepFlags & Record<string, string>) => {
    setStatus(await sweepCommand(flags, settingFlags(flags, sweep), parts))
  })
}

function addSimulate(program: Command, parts: CommandParts): void {
  program
    .command('simulate')
    .description('Write the log of a made-up farm, its site file and its truth.')
    .requiredOption('--out <folder>', 'folder to write to')
    .option('--turbines <n>', 'number of turbines', '8')
    .option('--days <n>', 'days from the start', '30')
    .option('--seed <n>', 'the same seed gives the same farm', '1')
    .option('--rate <seconds>', 'length of a row; 1 gives a row a second', '600')
    .option('--name <name>', 'name of the site')
    .option('--start <date>', 'first day (UTC), such as 2026-03-01')
    .option('--random', 'draw controller, sensors, weather and layout from ranges too')
    .option(
      '--fault <fault>',
      'TURBINE:KIND:FROM:TO[:SIZE[:PLACE]], times in UTC; may be given again',
      collect,
      [],
    )
    .option(
      '--correction <correction>',
      "TURBINE:AT:DEGREES[:right|wrong-sign|not-entered], of the controller's vane offset; may be given again",
      collect,
      [],
    )
    .addOption(
      new Option('--vane-logged <which>', "the vane before or after the controller's correction").choices([
        'beforeCorrection',
        'afterCorrection',
      ]),
    )
    .option('--demo', 'the farm of data-demo/; no other option but --out is taken')
    .addOption(logLevelOption())
    .addHelpText(
      'after',
      `
Examples:
  yawledger simulate --out made-up --turbines 8 --days 30 --seed 7
  yawledger simulate --out fast --turbines 1 --days 3 --rate 1
  yawledger simulate --out faulty --fault Q03:frozen:2026-03-05:2026-03-08 --fault Q05:nacelle-shift:2026-03-12T04:00Z:2026-04-01:24
  yawledger simulate --out corrected --days 60 --correction Q04:2026-03-20T10:00Z:6

Kinds of faults, and their numbers with what they are when none is given. A kind may be written by its end where no
other has it (frozen). The truth file holds every fault with its turbine, kind, start, end and size.
${faultsHelp()}

${EXIT_CODES}`,
    )
    .action(async (flags: SimulateFlags, command: Command) => {
      await simulateCommand(flags, command, parts)
    })
}

function logLevelOption(): Option {
  return new Option('--log-level <level>', 'fatal, error, warn, info, debug, trace or silent')
}

function collect(value: string, before: string[]): string[] {
  return [...before, value]
}

function settingFlags(flags: Record<string, unknown>, command: Command): SettingFlags {
  const settings: SettingFlags = {}
  for (const pair of Array.isArray(flags['set']) ? (flags['set'] as string[]) : []) {
    const [name = '', ...value] = pair.split('=')
    settings[name] = { flag: `--set ${name}`, value: value.join('=') }
  }
  for (const [flag, setting] of Object.entries(SETTING_FLAGS)) {
    const value = flags[flag]
    const long = command.options.find((option) => option.attributeName() === flag)?.long ?? `--${flag}`
    if (typeof value === 'string') settings[setting] = { flag: long, value }
  }
  return settings
}
