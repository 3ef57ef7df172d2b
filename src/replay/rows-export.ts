import { createReadStream } from 'node:fs'
import { mkdir, rm } from 'node:fs/promises'
import { join } from 'node:path'
import { Readable } from 'node:stream'
import { buildFrame, correctSpeed, type TurbineColumns, type TurbineFrame } from '../frame/index.ts'
import { NUMBER_CHANNELS, SET_ASIDE_REASONS, STATISTICS, TEXT_CHANNELS } from '../sheet/index.ts'
import type { Store } from '../store/index.ts'
import type { RowsExport, RowsFormat } from './contract.ts'
import { arrowBytes, csvPieces, writeParquetTable, type TablePart, type TableSchema } from './table-files.ts'
import type { KeptRequest } from './frame-rows.ts'

const MEDIA_TYPES: Readonly<Record<RowsFormat, string>> = {
  csv: 'text/csv; charset=utf-8',
  parquet: 'application/vnd.apache.parquet',
  arrow: 'application/vnd.apache.arrow.stream',
}

/** What the frame says of a row, in the order of the columns; what it does not change follows as it was logged. */
const FRAME_COLUMNS: Readonly<
  Record<string, (turbine: TurbineFrame, columns: TurbineColumns) => ArrayLike<number>>
> = {
  coverage: ({ time }, { numbers }) => numbers['coverage'] ?? new Float64Array(time.length).fill(NaN),
  wind_speed: ({ windSpeed }) => windSpeed,
  normalised_wind_speed: ({ normalisedSpeed }) => normalisedSpeed,
  air_density: ({ density }) => density,
  turbulence: ({ turbulence }) => turbulence,
  vane: ({ vane }) => vane,
  vane_sd: ({ vaneSd }) => vaneSd,
  vane_min: ({ vaneMin }) => vaneMin,
  vane_max: ({ vaneMax }) => vaneMax,
  power: ({ power }) => power,
  nacelle_position: ({ nacellePosition }) => nacellePosition,
  indicated_direction: ({ indicatedDirection }) => indicatedDirection,
  running: ({ running }) => running,
  limited: ({ limited }) => limited,
}

/**
 * The frame of kept rows as a file: `time, turbine, set_aside`, then what the frame made of the row, then the other
 * channels as they were read.
 *
 * @param farm  the rows that were scored
 * @param intervalS  of them, s
 * @param folder  a new one for working files; removed when the stream ends or is destroyed
 */
export async function exportRows(
  store: Store,
  farm: readonly TurbineColumns[],
  about: { kept: KeptRequest; intervalS: number; format: RowsFormat; folder: string },
): Promise<RowsExport> {
  const { site, settings, ratedPowerKw, responsesPerDeg } = about.kept
  const frame = buildFrame(farm, {
    site,
    settings,
    intervalS: about.intervalS,
    ratedPowerKw: ratedPowerKw ?? undefined,
  })
  const turbines = frame.turbines.map((turbine) =>
    correctSpeed(turbine, responsesPerDeg[turbine.turbine] ?? 0, settings.vaneMaxDeg),
  )
  const schema = schemaOf(farm)
  const mediaType = MEDIA_TYPES[about.format]
  switch (about.format) {
    case 'csv':
      return { mediaType, stream: Readable.from(csvPieces(schema, partsOf(turbines, farm))) }
    case 'arrow': {
      const bytes = arrowBytes(schema, [...partsOf(turbines, farm)])
      return {
        mediaType,
        stream: Readable.from([Buffer.from(bytes.buffer, bytes.byteOffset, bytes.byteLength)]),
      }
    }
    case 'parquet': {
      const path = join(about.folder, 'rows.parquet')
      await mkdir(about.folder)
      const remove = () => rm(about.folder, { recursive: true, force: true })
      try {
        await writeParquetTable(store.scans, path, schema, partsOf(turbines, farm))
      } catch (error) {
        await remove()
        throw error
      }
      const stream = createReadStream(path)
      stream.once('close', () => void remove())
      return { mediaType, stream }
    }
  }
}

function* partsOf(turbines: readonly TurbineFrame[], farm: readonly TurbineColumns[]): Generator<TablePart> {
  for (const [i, turbine] of turbines.entries()) {
    const columns = farm[i]!
    const own = Object.entries(FRAME_COLUMNS).map(([name, value]) => [name, value(turbine, columns)] as const)
    yield {
      rows: turbine.time.length,
      columns: {
        ...columns.numbers,
        ...columns.texts,
        ...Object.fromEntries(own),
        time: turbine.time,
        turbine: Array.from(turbine.time, () => turbine.turbine),
        set_aside: Array.from(turbine.reason, (code) => (code === 0 ? 'used' : SET_ASIDE_REASONS[code - 1]!)),
      },
    }
  }
}

/** Other channels in the order of the channel table, each with its statistics. */
function schemaOf(farm: readonly TurbineColumns[]): TableSchema {
  const present = new Set(
    farm.flatMap(({ numbers, texts }) => [...Object.keys(numbers), ...Object.keys(texts)]),
  )
  const channels = Object.keys(NUMBER_CHANNELS).flatMap((name) => [
    name,
    ...STATISTICS.map((statistic) => `${name}_${statistic}`),
  ])
  const others = channels.filter((name) => present.has(name) && !(name in FRAME_COLUMNS))
  const texts = TEXT_CHANNELS.filter((name) => present.has(name))
  return {
    time: 'time',
    turbine: 'text',
    set_aside: 'text',
    ...Object.fromEntries(
      [...Object.keys(FRAME_COLUMNS), ...others].map((name) => [name, 'number' as const]),
    ),
    ...Object.fromEntries(texts.map((name) => [name, 'text' as const])),
  }
}
