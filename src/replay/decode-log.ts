import { rm } from 'node:fs/promises'
import { missingPulses } from '../analysis/index.ts'
import { DECODED_CHANNELS, decodingPlan, holdsRawWords, RawWordDecoder } from '../frame/index.ts'
import type { SensorFinding, SiteFile } from '../sheet/index.ts'
import { countRows, joinColumns, openHighRate, type Store } from '../store/index.ts'
import { writeParquetTable, type TablePart, type TableSchema } from './table-files.ts'

const DAY_MS = 86_400_000

/** What came of the raw words of a log. */
export interface DecodedLog {
  /** Where the rows lie now: the given path, or beside it, where words were decoded. */
  readonly path: string
  readonly warnings: readonly string[]
  /** Turbine -> what went wrong while its pulses were counted. */
  readonly findings: ReadonlyMap<string, SensorFinding[]>
}

/**
 * Decodes the raw words of a log as the site file describes its sensors: the channels that they stand for are added, or fill
 * the gaps of those that are logged as well. A turbine's day at a time, so that memory does not grow with the log. A log
 * without raw words stays as it is.
 *
 * @param path  Parquet of clean rows in the data folder, sorted by turbine and time; removed where another takes its place.
 */
export async function decodeLog(
  store: Store,
  path: string,
  site: SiteFile,
  signal: AbortSignal,
): Promise<DecodedLog> {
  const source = await openHighRate(store.scans, path)
  if (!holdsRawWords(source.numbers)) return { path, warnings: [], findings: new Map() }
  const warnings: string[] = []
  const findings = new Map<string, SensorFinding[]>()
  const stays = (await countRows(store.scans, path)).map((extent) => {
    const setup = (site.turbines ?? []).find(({ turbine }) => turbine === extent.turbine)
    return { extent, setup: setup ?? { turbine: extent.turbine } }
  })
  const plans = stays.map(({ setup }) => decodingPlan(setup, source.numbers))
  plans.forEach(({ missing }, i) => {
    for (const line of missing) warnings.push(`${stays[i]!.extent.turbine}: ${line}`)
  })
  const makes = DECODED_CHANNELS.filter((channel) => plans.some((plan) => plan.makes.includes(channel)))
  if (makes.length === 0) return { path, warnings, findings }

  async function* parts(): AsyncGenerator<TablePart> {
    for (const [i, { extent, setup }] of stays.entries()) {
      const plan = plans[i]!
      const decoder = new RawWordDecoder(setup, plan)
      const { turbine, firstMs, lastMs } = extent
      for (let fromMs = Math.floor(firstMs / DAY_MS) * DAY_MS; fromMs <= lastMs; fromMs += DAY_MS) {
        signal.throwIfAborted()
        const span = await source.read(turbine, plan.reads, { fromMs, toMs: fromMs + DAY_MS })
        const decoded = decoder.add(span.time, span.numbers)
        yield {
          rows: span.time.length,
          columns: { ...decoded, time: span.time, turbine: Array.from(span.time, () => turbine) },
        }
      }
      const { account } = decoder
      findings.set(turbine, missingPulses(account))
      for (const [channel, invalid] of Object.entries(account.invalid)) {
        warnings.push(
          `${turbine}: ${invalid} values of ${channel} are no words of the sensor that the site file describes: they count as missing`,
        )
      }
    }
  }
  const schema: TableSchema = {
    turbine: 'text',
    time: 'integer',
    ...Object.fromEntries(makes.map((channel) => [channel, 'number' as const])),
  }
  const columnsPath = `${path}.words.parquet`
  const targetPath = `${path}.decoded.parquet`
  try {
    await writeParquetTable(store.scans, columnsPath, schema, parts())
    await joinColumns(store.scans, { path, columnsPath, targetPath }, makes)
  } finally {
    await rm(columnsPath, { force: true })
  }
  await rm(path, { force: true })
  return { path: targetPath, warnings, findings }
}
