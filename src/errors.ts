/**
 * Every mistake a caller can make, once: what HTTP answers, how the command line exits, what it is called.
 * Clients rely on the code; people read the message, which names the place, what was expected and what came.
 */
export const ERRORS = {
  // kernel: arguments that do not fit each other
  LENGTH_MISMATCH: { status: 400, exit: 1, title: 'Series of different length' },
  NEGATIVE_WEIGHT: { status: 400, exit: 1, title: 'A weight below zero' },
  OUT_OF_RANGE: { status: 400, exit: 1, title: 'A number outside its range' },
  // logs
  LOG_EMPTY: { status: 400, exit: 1, title: 'The log is empty' },
  LOG_NO_HEADER: { status: 400, exit: 1, title: 'The log has no header line' },
  LOG_NO_ROWS: { status: 422, exit: 1, title: 'No row of the log can be used' },
  LOG_COLUMNS_MISSING: { status: 422, exit: 1, title: 'Columns that the job needs are missing' },
  LOG_COLUMN_UNREADABLE: { status: 422, exit: 1, title: 'A column cannot be read' },
  LOG_COLUMN_MAP: { status: 400, exit: 2, title: 'The column map does not fit the log' },
  LOG_TIME: { status: 422, exit: 1, title: 'The time stamps cannot be read' },
  LOG_UNIT: { status: 422, exit: 1, title: 'A column seems to be in another unit' },
  LOG_LINE_TOO_LONG: { status: 413, exit: 1, title: 'A line of the log is too long' },
  LOG_TOO_LARGE: { status: 413, exit: 1, title: 'The log is too large' },
  LOG_TOO_MANY_COLUMNS: { status: 413, exit: 1, title: 'The log has too many columns' },
  LOG_TOO_MANY_ROWS: { status: 413, exit: 1, title: 'The log has too many rows' },
  LOG_CORRUPT: { status: 400, exit: 1, title: 'The log is damaged' },
  LOG_NOT_FOUND: { status: 404, exit: 2, title: 'No such log file' },
  // requests
  BAD_REQUEST: { status: 400, exit: 2, title: 'The request cannot be understood' },
  BAD_OPTION: { status: 400, exit: 2, title: 'An option has a wrong value' },
  BAD_SITE: { status: 422, exit: 2, title: 'The site file does not fit its schema' },
  UNSUPPORTED_MEDIA_TYPE: { status: 415, exit: 2, title: 'Content type not taken here' },
  NOT_FOUND: { status: 404, exit: 2, title: 'Nothing under this address' },
  REPLAY_NOT_FOUND: { status: 404, exit: 2, title: 'No such replay' },
  FRAME_GONE: { status: 410, exit: 1, title: 'The rows of the replay have been removed' },
  SITE_NOT_FOUND: { status: 404, exit: 2, title: 'No such site' },
  TURBINE_NOT_FOUND: { status: 404, exit: 2, title: 'No such turbine' },
  BATCH_NOT_FOUND: { status: 404, exit: 2, title: 'No such log of this site' },
  ENTRY_NOT_FOUND: { status: 404, exit: 2, title: 'No such entry of the site' },
  NOT_ACCEPTABLE: { status: 406, exit: 2, title: 'Not to be had in any form that is accepted' },
  BODY_TOO_LARGE: { status: 413, exit: 2, title: 'The document is too large' },
  METHOD_NOT_ALLOWED: { status: 405, exit: 2, title: 'Method not allowed here' },
  // the service itself
  BAD_CONFIG: { status: 500, exit: 2, title: 'A setting has a wrong value' },
  STORAGE_FULL: { status: 507, exit: 1, title: 'The data folder is full' },
  BUSY: { status: 503, exit: 1, title: 'Too many requests wait already' },
  INTERRUPTED: { status: 503, exit: 1, title: 'The service stopped before this was done' },
  NOT_READY: { status: 503, exit: 1, title: 'The service is not ready' },
  INTERNAL: { status: 500, exit: 1, title: 'A fault of this program' },
} as const satisfies Record<string, { status: number; exit: number; title: string }>

export type ErrorCode = keyof typeof ERRORS

/** The caller's mistake. `detail` is machine-readable context that is safe to show to the caller. */
export class InputError extends Error {
  readonly code: ErrorCode
  readonly detail: Readonly<Record<string, unknown>>

  constructor(
    code: ErrorCode,
    message: string,
    options: { detail?: Record<string, unknown>; cause?: unknown } = {},
  ) {
    super(message, options.cause === undefined ? undefined : { cause: options.cause })
    this.name = 'InputError'
    this.code = code
    this.detail = options.detail ?? {}
  }
}
