/** What a log in a request body may be called; a log reader tells the kinds apart by the bytes. */
export const LOG_MEDIA_TYPES = [
  'text/csv',
  'text/plain',
  'text/tab-separated-values',
  'application/octet-stream',
  'application/gzip',
] as const
