import { InputError } from '../errors.ts'
import { jsonFields, jsonKeys } from './json-line.ts'
import { SAFE_DELIMITER, splitFields } from './split-fields.ts'

/** How the lines of a delimited text are built, told from its beginning. */
export interface Dialect {
  /** `json`: every line is an object; then there is no header line and the delimiter is the one written to the clean file. */
  readonly form: 'delimited' | 'json'
  readonly delimiter: string
  /** Names as in the header, quotes and marks taken off; unnamed columns have an empty name. */
  readonly header: readonly string[]
  /** Line number of the header, 1 = first. */
  readonly headerLine: number
  /** Lines before the header that carry text. */
  readonly preambleLines: number
  readonly hasQuotes: boolean
  readonly decimalComma: boolean
  /** Data lines of the beginning, split; at most 2,000. Lines that do not fit are left out. */
  readonly rows: readonly (readonly string[])[]
}

const CANDIDATES = ['\t', ';', ',', '|'] as const
const MOST_SAMPLE_LINES = 4000

/**
 * @param sample  the beginning of the file as text; when `complete` is false its last line may be cut and is not looked at.
 * @throws InputError LOG_EMPTY, LOG_NO_HEADER
 */
export function sniffDialect(name: string, sample: string, complete: boolean): Dialect {
  const lines = sample.split(/\r\n|\n|\r/, MOST_SAMPLE_LINES)
  if (!complete && lines.length > 1 && lines.length < MOST_SAMPLE_LINES) lines.pop()
  const used = lines.map((text, i) => ({ text, line: i + 1 })).filter(({ text }) => text.trim() !== '')
  if (used.length === 0)
    throw new InputError('LOG_EMPTY', `${name}: expected a log, got nothing but blank lines`)

  const json = sniffJson(
    name,
    used.map(({ text }) => text),
    complete,
  )
  if (json) return json
  const body = used.filter(({ text }) => !text.startsWith('#'))
  const { delimiter, fields } = chooseDelimiter(
    body.length > 0 ? body.map(({ text }) => text) : [used[0]!.text],
  )
  const header = findHeader(name, used, delimiter, fields)
  const rows: string[][] = []
  for (const { text, line } of used) {
    if (line <= header.line || rows.length >= 2000) continue
    const row = splitFields(text, delimiter)
    if (row && row.length === header.names.length) rows.push(row.map((field) => field.trim()))
  }
  return {
    form: 'delimited',
    delimiter,
    header: header.names,
    headerLine: header.line,
    preambleLines: used.filter(({ line }) => line < header.line).length,
    hasQuotes: sample.includes('"'),
    decimalComma: hasDecimalComma(rows, delimiter),
    rows,
  }
}

/** One JSON object per line: its keys are the header. */
function sniffJson(name: string, lines: readonly string[], complete: boolean): Dialect | null {
  const first = lines[0]!.trimStart()
  if (first.startsWith('[') && /^\[\s*(\{|$)/.test(first)) {
    throw new InputError(
      'LOG_NO_HEADER',
      `${name}: expected delimited text or one JSON object per line, got a JSON array`,
    )
  }
  const keys = jsonKeys(lines)
  if (!keys) {
    if (!first.startsWith('{')) return null
    const what =
      complete || lines.length > 1
        ? 'a line that is no whole object'
        : 'an object that is longer than the beginning'
    throw new InputError('LOG_NO_HEADER', `${name} line 1: expected one JSON object per line, got ${what}`)
  }
  const index = new Map(keys.map((key, i) => [key, i]))
  return {
    form: 'json',
    delimiter: SAFE_DELIMITER,
    header: keys,
    headerLine: 0,
    preambleLines: 0,
    hasQuotes: true,
    decimalComma: false,
    rows: lines.slice(0, 2000).flatMap((line) => {
      const object = jsonFields(line, index)
      return object ? [object.fields] : []
    }),
  }
}

/** Splits a line as the dialect has it; null when it cannot be told apart. */
export function lineFields(
  dialect: Pick<Dialect, 'form' | 'delimiter'>,
  keys: ReadonlyMap<string, number>,
  line: string,
): string[] | null {
  return dialect.form === 'json'
    ? (jsonFields(line, keys)?.fields ?? null)
    : splitFields(line, dialect.delimiter)
}

/** The delimiter that gives most lines one and the same number of fields, two or more. */
function chooseDelimiter(lines: readonly string[]): { delimiter: string; fields: number } {
  let best = { delimiter: ',', fields: 1, agreeing: 0 }
  for (const delimiter of CANDIDATES) {
    const counts = new Map<number, number>()
    for (const line of lines) {
      const n = splitFields(line, delimiter)?.length ?? 0
      if (n >= 2) counts.set(n, (counts.get(n) ?? 0) + 1)
    }
    for (const [fields, agreeing] of counts) {
      // Decimal commas split lines too, but not the header: a clear lead is asked of a later candidate.
      if (
        agreeing > best.agreeing * 1.1 ||
        (agreeing === best.agreeing && best.delimiter === delimiter && fields > best.fields)
      ) {
        best = { delimiter, fields, agreeing }
      }
    }
  }
  return best
}

function findHeader(
  name: string,
  used: readonly { text: string; line: number }[],
  delimiter: string,
  fields: number,
): { names: string[]; line: number } {
  for (const [i, { text, line }] of used.entries()) {
    const names = splitFields(text.replace(/^#+\s*/, ''), delimiter)?.map((field) => field.trim())
    if (!names || Math.abs(names.length - fields) > 1) continue
    const next = used[i + 1]?.text
    const isComment = text.startsWith('#')
    // A comment line is the header only when data follows at once.
    if (
      isComment &&
      (next === undefined || next.startsWith('#') || looksLikeHeader(splitFields(next, delimiter) ?? []))
    ) {
      continue
    }
    if (!looksLikeHeader(names)) {
      throw new InputError(
        'LOG_NO_HEADER',
        `${name} line ${line}: expected a header line with the names of the columns, got what looks like data: ${text.slice(0, 120)}`,
      )
    }
    // Data lines that end in a delimiter have one field more than the header names, and the reverse.
    if (names.length === fields - 1) names.push('')
    if (names.length === fields + 1 && names.at(-1) === '') names.pop()
    if (names.length !== fields) continue
    return { names, line }
  }
  throw new InputError(
    'LOG_NO_HEADER',
    `${name}: expected a header line with ${fields} names like the ${fields} fields of the lines below it, got none`,
  )
}

/** Names are words: a line of which a part is a number or a time is data. */
function looksLikeHeader(fields: readonly string[]): boolean {
  const filled = fields.filter((field) => field.trim() !== '')
  if (filled.length === 0) return false
  const data = filled.filter(
    (field) =>
      /^\s*[-+]?[\d.,]+(e[-+]?\d+)?\s*$/i.test(field) ||
      /\d{1,4}[-/.]\d{1,2}[-/.]\d{1,4}/.test(field) ||
      /^\d{1,2}:\d{2}/.test(field),
  )
  return data.length * 3 < filled.length || (data.length === 0 && filled.length > 0)
}

/**
 * Cells such as `7,25` and none such as `7.25`: dates and texts do not count. In a text with commas between (quoted) cells
 * three digits behind every comma may as well be thousands: then it is not guessed.
 */
function hasDecimalComma(rows: readonly (readonly string[])[], delimiter: string): boolean {
  let commas = 0
  let points = 0
  let certain = 0
  for (const row of rows) {
    for (const cell of row) {
      if (/^[-+]?\d+,\d+(e[-+]?\d+)?$/i.test(cell)) {
        commas++
        if (!/,\d{3}$/.test(cell)) certain++
      } else if (/^[-+]?\d+\.\d+(e[-+]?\d+)?$/i.test(cell)) points++
    }
  }
  return commas > points && (delimiter !== ',' || (certain > 0 && points === 0))
}
