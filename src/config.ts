import { availableParallelism } from 'node:os'
import { InputError } from './errors.ts'
import { crossedSettings, ScoringSettings } from './sheet/index.ts'

/**
 * libuv shares four threads among all file I/O, compression and native queries of a process. Four running DuckDB queries
 * block every read and write of the rest, so the pool is made this large at least.
 */
export const MIN_THREAD_POOL = 12

interface Entry<T> {
  /** What the value means, for help texts and DEVELOPERS.md. */
  readonly text: string
  readonly unit: string
  readonly default: T
  /** What a value must be, as it stands in an error. */
  readonly expected: string
  /** The value that the text stands for, or undefined when it is no such value. */
  readonly parse: (text: string) => T | undefined
}

const PLAIN_NUMBER = /^[+-]?(\d+\.?\d*|\.\d+)(e[+-]?\d+)?$/i

function number(range: {
  min: number
  max: number
  default: number
  unit: string
  text: string
}): Entry<number> {
  return {
    text: range.text,
    unit: range.unit,
    default: range.default,
    expected: `${range.min}-${range.max}`,
    parse(text) {
      const value = PLAIN_NUMBER.test(text) ? Number(text) : NaN
      return value >= range.min && value <= range.max ? value : undefined
    },
  }
}

function integer(range: {
  min: number
  max: number
  default: number
  unit: string
  text: string
}): Entry<number> {
  const asNumber = number(range)
  return {
    ...asNumber,
    parse(text) {
      const value = asNumber.parse(text)
      return Number.isInteger(value) ? value : undefined
    },
  }
}

function text(options: { default: string; text: string }): Entry<string> {
  return {
    text: options.text,
    unit: '',
    default: options.default,
    expected: 'some text',
    parse: (value) => (value.trim() === '' || value.includes('\0') ? undefined : value.trim()),
  }
}

function optionalText(options: { text: string }): Entry<string | null> {
  return { ...text({ default: '', text: options.text }), default: null }
}

function choice<const T extends string>(options: { of: readonly T[]; default: T; text: string }): Entry<T> {
  return {
    text: options.text,
    unit: '',
    default: options.default,
    expected: options.of.join(' | '),
    parse: (value) => options.of.find((one) => one === value),
  }
}

type NumberSetting = Exclude<keyof ScoringSettings, 'assumedResponsePctPerDeg'>

/** A setting of the estimation: its range and its text stand in the schema that the score sheet prints it by. */
function scoring(key: NumberSetting, unit: string, defaultValue: number): Entry<number> {
  const schema = ScoringSettings.properties[key] as unknown as {
    type: string
    minimum: number
    maximum: number
    description: string
  }
  const make = schema.type === 'integer' ? integer : number
  return make({
    min: schema.minimum,
    max: schema.maximum,
    default: defaultValue,
    unit,
    text: schema.description,
  })
}

const [responseRange] = ScoringSettings.properties.assumedResponsePctPerDeg.anyOf as unknown as [
  { minimum: number; maximum: number },
]

const assumedResponse = number({
  min: responseRange.minimum,
  max: responseRange.maximum,
  default: 0,
  unit: '% per degree',
  text: 'response of the anemometer to the vane, taken as known; none: unknown',
})

/** Every setting once: name, unit, range, default, text. The name in the environment is YAWLEDGER_ and the key in capitals. */
export const SETTINGS = {
  host: text({ default: '127.0.0.1', text: 'address that the service listens on; 0.0.0.0 for all' }),
  port: integer({ min: 1, max: 65535, default: 8080, unit: '', text: 'port that the service listens on' }),
  dataFolder: text({ default: './data', text: 'folder that the service keeps its replays in' }),
  databaseUrl: optionalText({ text: 'PostgreSQL address of a fleet; none: the embedded catalogue' }),
  logLevel: choice({
    of: ['fatal', 'error', 'warn', 'info', 'debug', 'trace', 'silent'],
    default: 'info',
    text: 'least severe message that is logged',
  }),
  bodyLimitMb: integer({
    min: 1,
    max: 65536,
    default: 1024,
    unit: 'MB',
    text: 'largest request body, as sent (compressed)',
  }),
  decompressedLimitMb: integer({
    min: 1,
    max: 1048576,
    default: 8192,
    unit: 'MB',
    text: 'largest log after decompression',
  }),
  lineLimitKb: integer({ min: 1, max: 65536, default: 1024, unit: 'kB', text: 'longest line of a log' }),
  columnsLimit: integer({ min: 2, max: 20000, default: 2000, unit: '', text: 'most columns of a log' }),
  rowsLimit: integer({
    min: 1,
    max: 2_000_000_000,
    default: 200_000_000,
    unit: '',
    text: 'most rows of a log',
  }),
  scanMemoryMb: integer({
    min: 64,
    max: 1048576,
    default: 512,
    unit: 'MB',
    text: 'memory of one scan of a log before it uses the disk',
  }),
  scanThreads: integer({ min: 1, max: 256, default: 2, unit: '', text: 'threads of one scan of a log' }),
  scoreThreads: integer({
    min: 1,
    max: 256,
    default: Math.max(1, availableParallelism() - 1),
    unit: '',
    text: 'worker threads that score turbines; default: cores less one',
  }),
  diskLimitMb: integer({
    min: 0,
    max: 100_000_000,
    default: 0,
    unit: 'MB',
    text: 'most that stored logs and frames may take; one more is refused (507 STORAGE_FULL); 0: as much as the disk has',
  }),
  replaysAtOnce: integer({
    min: 1,
    max: 64,
    default: 1,
    unit: '',
    text: 'most replays of stored logs that run at once in the background; others wait',
  }),
  uploadsAtOnce: integer({
    min: 1,
    max: 64,
    default: 2,
    unit: '',
    text: 'most requests whose logs are read and scored at once; others wait',
  }),
  uploadsWaiting: integer({
    min: 0,
    max: 1000,
    default: 16,
    unit: '',
    text: 'most requests that wait for their turn; one more is refused (503 BUSY)',
  }),
  uploadIdleS: integer({
    min: 1,
    max: 3600,
    default: 60,
    unit: 's',
    text: 'silence after which an upload is given up',
  }),
  keepFramesDays: integer({
    min: 0,
    max: 36500,
    default: 30,
    unit: 'days',
    text: 'how long the rows of a one-shot replay are kept',
  }),
  exponent: scoring('exponent', '', 3),
  exponentLow: scoring('exponentLow', '', 1.4),
  exponentHigh: scoring('exponentHigh', '', 3),
  actionThresholdDeg: scoring('actionThresholdDeg', 'degrees', 3),
  resamples: scoring('resamples', '', 1000),
  seed: scoring('seed', '', 1),
  assumedResponsePctPerDeg: {
    ...assumedResponse,
    default: null,
    expected: `${assumedResponse.expected} or none`,
    parse: (value: string) => (value === 'none' ? null : assumedResponse.parse(value)),
  },
  responseSpreadPctPerDeg: scoring('responseSpreadPctPerDeg', '% per degree', 0.15),
  windMinMs: scoring('windMinMs', 'm/s', 4.5),
  vaneMaxDeg: scoring('vaneMaxDeg', 'degrees', 15),
  yawMoveMaxDeg: scoring('yawMoveMaxDeg', 'degrees', 5),
  fastDirectionDeg: scoring('fastDirectionDeg', 'degrees', 10),
  fastSpeedMs: scoring('fastSpeedMs', 'm/s', 2),
  minimumRows: scoring('minimumRows', 'rows', 150),
  minimumDays: scoring('minimumDays', 'days', 5),
} as const satisfies Record<string, Entry<unknown>>

export type SettingName = keyof typeof SETTINGS
export type Config = {
  readonly [K in SettingName]: (typeof SETTINGS)[K] extends Entry<infer T> ? T : never
}

/** `port` -> `YAWLEDGER_PORT`, `bodyLimitMb` -> `YAWLEDGER_BODY_LIMIT_MB`. */
export function environmentName(key: string): string {
  return `YAWLEDGER_${key.replaceAll(/[A-Z]/g, (letter) => `_${letter}`).toUpperCase()}`
}

/** A value given on the command line, and the flag that it came by, for the error. */
export interface FlagValue {
  readonly flag: string
  readonly value: string
}

/**
 * The settings in force: defaults, over them the environment, over that the command line.
 *
 * @param environment  an empty value counts as not given, as compose files write it.
 * @returns the settings, and the names in the environment that start with YAWLEDGER_ and are no setting. Those are no error:
 *   orchestrators add variables named after a service (YAWLEDGER_SERVICE_HOST).
 * @throws InputError BAD_CONFIG for the environment, BAD_OPTION for a flag; each names its place.
 */
export function readConfig(
  environment: Readonly<Record<string, string | undefined>>,
  flags: Readonly<Record<string, FlagValue>> = {},
): { config: Config; unknownNames: string[] } {
  const values: Record<string, unknown> = {}
  for (const [key, entry] of Object.entries<Entry<unknown>>(SETTINGS)) {
    const flag = flags[key]
    const fromEnvironment = environment[environmentName(key)]
    if (flag !== undefined) {
      const value = entry.parse(flag.value)
      if (value === undefined) {
        throw new InputError('BAD_OPTION', `${flag.flag}: expected ${entry.expected}, got "${flag.value}"`)
      }
      values[key] = value
    } else if (fromEnvironment !== undefined && fromEnvironment !== '') {
      const value = entry.parse(fromEnvironment)
      if (value === undefined) {
        throw new InputError(
          'BAD_CONFIG',
          `config ${key}: expected ${entry.expected}, got "${fromEnvironment}" (${environmentName(key)})`,
        )
      }
      values[key] = value
    } else {
      values[key] = entry.default
    }
  }
  for (const [key, flag] of Object.entries(flags)) {
    if (!Object.hasOwn(SETTINGS, key)) {
      const names = Object.keys(SETTINGS).join(', ')
      throw new InputError('BAD_OPTION', `${flag.flag}: expected one of ${names}, got "${key}"`)
    }
  }
  const known = new Set(Object.keys(SETTINGS).map(environmentName))
  const unknownNames = Object.keys(environment).filter(
    (name) => name.startsWith('YAWLEDGER_') && !known.has(name),
  )
  const config = values as unknown as Config
  const crossed = crossedSettings(config)
  if (crossed !== null) throw new InputError('BAD_CONFIG', `config ${crossed}`)
  return { config, unknownNames: unknownNames.sort() }
}

/** The part of the settings that the estimation takes and every score sheet prints. */
export function scoringSettings(config: Config): ScoringSettings {
  const names = Object.keys(ScoringSettings.properties) as (keyof ScoringSettings)[]
  return Object.fromEntries(names.map((name) => [name, config[name]])) as unknown as ScoringSettings
}

/** Every setting as a line of a help text: name in the environment, what it takes, its default, what it means. */
export function settingsHelp(): string {
  return Object.entries<Entry<string | number | null>>(SETTINGS)
    .map(([key, { expected, unit, default: value, text: meaning }]) => {
      const range = `${expected}${unit === '' ? '' : ` ${unit}`}; default ${value ?? 'none'}`
      return `  ${environmentName(key)}\n      ${meaning} (${range})\n`
    })
    .join('')
}
