import { PURPOSE, RandomStream } from './random.ts'
import { ROW_COLUMNS, type RowColumn } from './rows.ts'
import type { SimulatedFarm, SimulatedTurbine } from './simulate-farm.ts'

/** Decimals as loggers have them. */
const DECIMALS: Record<RowColumn, number> = {
  wind_speed: 2,
  wind_speed_sd: 2,
  vane: 2,
  vane_sd: 2,
  vane_2: 2,
  nacelle_position: 1,
  yaw_active: 3,
  power: 1,
  power_sd: 1,
  pitch: 2,
  rotor_speed: 2,
  power_limit: 0,
  air_temperature: 1,
  air_pressure: 1,
  reference_yaw_error: 2,
  reference_wind_speed: 2,
}

/** What the lines of a log hold: `rows` rows of turbines, of which `cut` and `unreadable` cannot be read, and the rest. */
export interface LogAccount {
  /** Lines with text after the header. */
  dataLines: number
  rows: number
  /** Lines that end after the name of the turbine. */
  cut: number
  /** Lines with text in place of the time. */
  unreadable: number
  /** Lines that come twice. */
  repeated: number
  /** Lines without text. */
  blank: number
  missingCells: number
}

/**
 * The log of a farm as CSV in long form, in pieces of one time step each: header, then rows by time and turbine; UTC with
 * Z; a missing value is an empty field. Blemishes (`missingCells`, `brokenLines`) come from streams of their own.
 *
 * @param account  is filled while the pieces are taken.
 */
export function* logCsv(farm: SimulatedFarm, account: LogAccount): Generator<string> {
  const { scenario, turbines } = farm
  const names = ROW_COLUMNS.filter(
    (name) =>
      !(name.startsWith('reference_') && scenario.references.length === 0) &&
      !(name === 'vane_2' && scenario.secondVaneOffsetDeg === null) &&
      !(name.endsWith('_sd') && scenario.rateS === 1),
  )
  const decimals = names.map((name) =>
    name.startsWith('vane') && name !== 'vane_sd' ? scenario.vaneDecimals : DECIMALS[name],
  )
  const rowCount = turbines[0]!.timeMs.length
  const cellStream = new RandomStream(scenario.seed, PURPOSE.blemish, 0)
  const lineStream = new RandomStream(scenario.seed, PURPOSE.blemish, 1)
  const broken = drawBroken(lineStream, scenario.brokenLines, rowCount * turbines.length)
  yield `time,turbine,${names.join(',')},status\n`

  for (let row = 0; row < rowCount; row++) {
    let piece = ''
    for (const [index, turbine] of turbines.entries()) {
      const time = new Date(turbine.timeMs[row]!).toISOString().slice(0, 19) + 'Z'
      const head = `${time},${turbine.turbine}`
      let line = head
      for (let c = 0; c < names.length; c++) {
        line += ',' + cell(turbine, names[c]!, row, decimals[c]!, scenario.nacelleScale === 'wrapped')
      }
      line += ',' + turbine.status[row]!
      if (scenario.missingCells > 0) line = dropCells(line, cellStream, scenario.missingCells, account)
      account.rows++
      account.dataLines++
      const kind = broken.get(row * turbines.length + index)
      if (kind === 'cut') line = head
      if (kind === 'unreadable') line = '#N/A' + line.slice(time.length)
      if (kind === 'repeated') {
        line += '\n' + line
        account.dataLines++
      }
      if (kind === 'blank') line = '\n' + line
      if (kind !== undefined) account[kind]++
      piece += line + '\n'
    }
    yield piece
  }
}

export function emptyAccount(): LogAccount {
  return { dataLines: 0, rows: 0, cut: 0, unreadable: 0, repeated: 0, blank: 0, missingCells: 0 }
}

const KINDS = ['cut', 'unreadable', 'repeated', 'blank'] as const

function drawBroken(stream: RandomStream, ofEach: number, lines: number) {
  const broken = new Map<number, (typeof KINDS)[number]>()
  const wanted = Math.min(ofEach * KINDS.length, Math.floor(lines / 2))
  while (broken.size < wanted) {
    const at = Math.floor(stream.uniform() * lines)
    if (!broken.has(at)) broken.set(at, KINDS[broken.size % KINDS.length]!)
  }
  return broken
}

function cell(
  turbine: SimulatedTurbine,
  name: RowColumn,
  row: number,
  decimals: number,
  wrapped: boolean,
): string {
  const value = turbine.columns[name][row]!
  if (Number.isNaN(value)) return ''
  const text = value.toFixed(decimals)
  if (value < 0 && Number(text) === 0) return text.slice(1)
  return wrapped && name === 'nacelle_position' && text === '360.0' ? '0.0' : text
}

/** Empties cells after time and turbine. */
function dropCells(line: string, stream: RandomStream, share: number, account: LogAccount): string {
  return line
    .split(',')
    .map((text, i) => {
      if (i < 2 || text === '' || stream.uniform() >= share) return text
      account.missingCells++
      return ''
    })
    .join(',')
}
