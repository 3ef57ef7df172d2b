/** What kind of failure an error of DuckDB reports, as far as a caller acts on it. */
export type DuckFailure = 'disk-full' | 'out-of-memory' | 'fatal' | 'other'

/**
 * After `fatal` the instance answers nothing any more: close it and open it again. `disk-full` may leave it fatal too:
 * the next statement tells.
 */
export function duckFailure(error: unknown): DuckFailure {
  const text = error instanceof Error ? error.message : String(error)
  if (/no space left|disk full|max_temp_directory_size|not enough space|failed to offload/i.test(text)) {
    return 'disk-full'
  }
  if (/FATAL Error|database has been invalidated/i.test(text)) return 'fatal'
  if (/Out of Memory Error|could not allocate/i.test(text)) return 'out-of-memory'
  return 'other'
}
