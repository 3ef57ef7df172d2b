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
]

export const VERSIONS_TABLE = `CREATE TABLE IF NOT EXISTS schema_versions (
  version integer NOT NULL PRIMARY KEY,
  applied_ms bigint NOT NULL
)`
