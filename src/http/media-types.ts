/** What a log in a request body may be called; a log reader tells the kinds apart by the bytes. */
export const LOG_MEDIA_TYPES = [
  'text/csv',
  'text/plain',
  'text/tab-separated-values',
  'application/octet-stream',
  'application/gzip',
  'application/x-ndjson',
  'application/vnd.apache.parquet',
] as const

export const JSON_MEDIA_TYPE = 'application/json'
export const FORM_MEDIA_TYPE = 'multipart/form-data'

/** `Text/CSV; charset=utf-8` -> `text/csv`; empty when there is none. */
export function bareMediaType(header: string | undefined): string {
  return (header ?? '').split(';', 1)[0]?.trim().toLowerCase() ?? ''
}
