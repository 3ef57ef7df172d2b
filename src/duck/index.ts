export type { Connection, SqlCell, SqlValue } from './connection.ts'
export { duckFailure, type DuckFailure } from './failure.ts'
export { openFile, openScans, type Bounds, type Database, type Scans } from './open.ts'
export { quoteIdentifier, quoteText, quoteTexts } from './quote.ts'
export {
  readColumns,
  streamColumns,
  type ColumnKind,
  type Columns,
  type ReadOptions,
} from './read-columns.ts'
export { writeParquet } from './write-parquet.ts'
