/**
 * Fields of a line that holds one JSON object, in the order of `keys`. Objects within it are flattened with dots, true and
 * false become 1 and 0.
 * @returns null when the line is no JSON object; `unknown` counts keys that are not among `keys`.
 */
export function jsonFields(
  line: string,
  keys: ReadonlyMap<string, number>,
): { fields: string[]; unknown: number } | null {
  const object = parseObject(line)
  if (!object) return null
  const fields = new Array<string>(keys.size).fill('')
  let unknown = 0
  flatten(object, '', 0, (key, value) => {
    const index = keys.get(key)
    if (index === undefined) unknown++
    else fields[index] = value
  })
  return { fields, unknown }
}

/** Keys of the objects of the beginning, in order of appearance; null when the first line is no JSON object. */
export function jsonKeys(lines: readonly string[]): string[] | null {
  if (!parseObject(lines[0] ?? '')) return null
  const keys = new Set<string>()
  for (const line of lines) {
    const object = parseObject(line)
    if (object) flatten(object, '', 0, (key) => keys.add(key))
  }
  return [...keys]
}

const DEEPEST = 4

function parseObject(line: string): object | null {
  if (!line.trimStart().startsWith('{')) return null
  try {
    const value: unknown = JSON.parse(line)
    return typeof value === 'object' ? value : null
  } catch {
    return null
  }
}

function flatten(
  object: object,
  prefix: string,
  depth: number,
  visit: (key: string, value: string) => void,
): void {
  for (const [name, value] of Object.entries(object) as [string, unknown][]) {
    const key = prefix + name
    if (value === null || value === undefined) visit(key, '')
    else if (typeof value === 'boolean') visit(key, value ? '1' : '0')
    // Line ends and the safe delimiter would break the clean file.
    // eslint-disable-next-line no-control-regex
    else if (typeof value === 'string') visit(key, value.replace(/[\u0000\u001f\r\n]/g, ' '))
    else if (typeof value === 'number') visit(key, String(value))
    else if (typeof value === 'object' && depth < DEEPEST) flatten(value, `${key}.`, depth + 1, visit)
  }
}
