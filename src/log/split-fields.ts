/** Stands between fields of a clean file when the log uses quotes: no text may contain it. */
export const SAFE_DELIMITER = '\u001f'

/**
 * Fields of one line with quotes taken off, as RFC 4180 has them.
 *
 * A field is quoted when its first character, blanks aside, is a quote; quotes inside other fields are text as long as they
 * come in pairs.
 * @returns null when a quote is left open: the line cannot be told apart.
 */
export function splitFields(line: string, delimiter: string): string[] | null {
  if (!line.includes('"')) return line.split(delimiter)
  const fields: string[] = []
  let at = 0
  for (;;) {
    let start = at
    while (line[start] === ' ') start++
    if (line[start] !== '"') {
      const end = line.indexOf(delimiter, at)
      const field = line.slice(at, end < 0 ? line.length : end)
      if ((field.split('"').length & 1) === 0) return null
      fields.push(field)
      if (end < 0) return fields
      at = end + delimiter.length
      continue
    }
    let value = ''
    let from = start + 1
    for (;;) {
      const quote = line.indexOf('"', from)
      if (quote < 0) return null
      value += line.slice(from, quote)
      from = quote + 1
      if (line[from] !== '"') break
      value += '"'
      from++
    }
    while (line[from] === ' ' && delimiter !== ' ') from++
    fields.push(value)
    if (from >= line.length) return fields
    if (!line.startsWith(delimiter, from)) return null
    at = from + delimiter.length
  }
}
