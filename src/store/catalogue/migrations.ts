/**
 * Steps of the schema of the embedded catalogue, in order; a step that was released never changes. Each runs in one
 * transaction together with its number.
 */
export const MIGRATIONS: readonly { version: number; statements: readonly string[] }[] = [
  {
    version: 1,
    statements: [
      `CREATE TABLE replays (
         id text NOT NULL PRIMARY KEY,
         state text NOT NULL,
         site text,
         created_ms bigint NOT NULL,
         finished_ms bigint,
         problem_code text,
         problem_detail text
       )`,
      // Apart from the state, so that a list does not read the sheets, which are large.
      `CREATE TABLE replay_sheets (
         replay_id text NOT NULL PRIMARY KEY,
         sheet text NOT NULL
       )`,
    ],
  },
  {
    version: 2,
    statements: [
      `CREATE TABLE sites (
         site text NOT NULL PRIMARY KEY,
         document text NOT NULL,
         created_ms bigint NOT NULL,
         changed_ms bigint NOT NULL
       )`,
      // A number that was given is never given again: rows of a deleted batch may still lie in a segment.
      `CREATE TABLE counters (
         name text NOT NULL PRIMARY KEY,
         value bigint NOT NULL
       )`,
      `CREATE TABLE batches (
         batch text NOT NULL PRIMARY KEY,
         site text NOT NULL,
         seq bigint NOT NULL,
         content_key text NOT NULL,
         reading text NOT NULL,
         receipt text NOT NULL,
         has_rejected boolean NOT NULL,
         created_ms bigint NOT NULL
       )`,
      `CREATE TABLE batch_parts (
         seq bigint NOT NULL,
         month text NOT NULL,
         turbine text NOT NULL,
         site text NOT NULL,
         first_ms bigint NOT NULL,
         last_ms bigint NOT NULL,
         row_count bigint NOT NULL,
         PRIMARY KEY (seq, month, turbine)
       )`,
      // only_seq: the file lacks batch_seq, since all its rows are of this batch.
      `CREATE TABLE segments (
         segment text NOT NULL PRIMARY KEY,
         site text NOT NULL,
         month text NOT NULL,
         row_count bigint NOT NULL,
         dead_rows bigint NOT NULL,
         byte_count bigint NOT NULL,
         checksum text NOT NULL,
         only_seq bigint
       )`,
      // Which segment holds the rows of a batch and month now; compaction changes this and nothing else.
      `CREATE TABLE segment_batches (
         seq bigint NOT NULL,
         month text NOT NULL,
         segment text NOT NULL,
         row_count bigint NOT NULL,
         PRIMARY KEY (seq, month)
       )`,
    ],
  },
  {
    version: 3,
    statements: [
      // Site file and settings that a sheet was made with: its frame is made again from them.
      `CREATE TABLE replay_requests (
         replay_id text NOT NULL PRIMARY KEY,
         request text NOT NULL
       )`,
    ],
  },
]

export const VERSIONS_TABLE = `CREATE TABLE IF NOT EXISTS schema_versions (
  version integer NOT NULL PRIMARY KEY,
  applied_ms bigint NOT NULL
)`
