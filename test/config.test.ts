import { expect, test } from 'vitest'
import { environmentName, readConfig, scoringSettings, SETTINGS, settingsHelp } from '../src/config.ts'
import { ScoringSettings } from '../src/sheet/index.ts'
import { checkShape } from '../src/setup/index.ts'

const wrong = (code: string, message: string) =>
  expect.objectContaining({ code, message: expect.stringContaining(message) as string }) as Error

test('without environment and flags the defaults are in force', () => {
  const { config, unknownNames } = readConfig({})
  expect(config).toMatchObject({ host: '127.0.0.1', port: 8080, exponent: 3, seed: 1, databaseUrl: null })
  expect(config.scoreThreads).toBeGreaterThanOrEqual(1)
  expect(unknownNames).toEqual([])
})

test('every default is a value that its own setting takes', () => {
  for (const [key, setting] of Object.entries(SETTINGS)) {
    if (setting.default === null) continue
    const { config } = readConfig({ [environmentName(key)]: String(setting.default) })
    expect(config[key as keyof typeof config], key).toBe(setting.default)
  }
})

test('the scoring settings are whole by the schema that the sheet prints them by', () => {
  const settings = scoringSettings(readConfig({}).config)
  expect(checkShape(ScoringSettings, settings, { code: 'BAD_OPTION', place: 'settings' })).toEqual(settings)
  expect(settings.assumedResponsePctPerDeg).toBeNull()
})

test('a flag wins over the environment, and the environment over the default', () => {
  const environment = { YAWLEDGER_PORT: '9000', YAWLEDGER_BODY_LIMIT_MB: '5' }
  const { config } = readConfig(environment, { port: { flag: '--port', value: '9001' } })
  expect(config.port).toBe(9001)
  expect(config.bodyLimitMb).toBe(5)
})

test('a range whose ends are crossed stops the start with its name', () => {
  expect(() => readConfig({ YAWLEDGER_EXPONENT_LOW: '2.5', YAWLEDGER_EXPONENT_HIGH: '2' })).toThrow(
    wrong('BAD_CONFIG', 'config exponentLow: expected at most exponentHigh (2), got 2.5'),
  )
})

test('an empty variable counts as not given', () => {
  expect(readConfig({ YAWLEDGER_PORT: '' }).config.port).toBe(8080)
})

test.each(['abc', '0', '65536', '-1', '80.5', '0x50', ' 80', 'NaN', 'Infinity', '8080 '])(
  'a port "%s" stops the start with its name',
  (value) => {
    expect(() => readConfig({ YAWLEDGER_PORT: value })).toThrow(
      wrong('BAD_CONFIG', `config port: expected 1-65535, got "${value}"`),
    )
  },
)

test('a wrong flag is named as it was typed', () => {
  expect(() => readConfig({}, { exponent: { flag: '--exponent', value: '9' } })).toThrow(
    wrong('BAD_OPTION', '--exponent: expected 0.5-6, got "9"'),
  )
  expect(() => readConfig({}, { exponent: { flag: '--exponent', value: '' } })).toThrow(
    wrong('BAD_OPTION', '--exponent: expected 0.5-6, got ""'),
  )
  expect(() => readConfig({}, { windMinMss: { flag: '--set windMinMss', value: '6' } })).toThrow(
    wrong('BAD_OPTION', '--set windMinMss: expected one of host, port'),
  )
  for (const name of ['constructor', '__proto__', 'toString']) {
    const flags = Object.fromEntries([[name, { flag: `--set ${name}`, value: '1' }]])
    expect(() => readConfig({}, flags), name).toThrow(wrong('BAD_OPTION', `--set ${name}`))
  }
})

test('the assumed response may be a number or none', () => {
  const given = (value: string) => readConfig({ YAWLEDGER_ASSUMED_RESPONSE_PCT_PER_DEG: value }).config
  expect(given('-0.3').assumedResponsePctPerDeg).toBe(-0.3)
  expect(given('none').assumedResponsePctPerDeg).toBeNull()
  expect(() => given('some')).toThrow(wrong('BAD_CONFIG', 'expected -5-5 or none, got "some"'))
})

test('a log level is one of a list', () => {
  expect(() => readConfig({ YAWLEDGER_LOG_LEVEL: 'loud' })).toThrow(
    wrong('BAD_CONFIG', 'config logLevel: expected fatal | error | warn'),
  )
})

test('names in the environment that are no setting are reported, and stop nothing', () => {
  const { unknownNames } = readConfig({
    YAWLEDGER_PROT: '1',
    YAWLEDGER_SERVICE_HOST: '10.0.0.1',
    PATH: '/bin',
  })
  expect(unknownNames).toEqual(['YAWLEDGER_PROT', 'YAWLEDGER_SERVICE_HOST'])
})

test('the help names every setting, its range and its default', () => {
  const help = settingsHelp()
  for (const key of Object.keys(SETTINGS)) expect(help).toContain(`  ${environmentName(key)}\n`)
  expect(help).toContain('(1-65535; default 8080)')
})
