/**
 * A month of 1 Hz rows of one turbine (2,592,000 rows, about 124 MB of CSV), posted over HTTP to a service of its own until
 * its rows are on disk, against a bare DuckDB copy of the same file to Parquet; pairs one after the other, medians, and
 * the peak memory of the service. Targets: at most 2 times as long, and 700 MB.
 */
import { spawn, type ChildProcess } from 'node:child_process'
import { once } from 'node:events'
import { closeSync, createReadStream, existsSync, openSync, readFileSync, statSync, writeSync } from 'node:fs'
import { mkdtemp, rm } from 'node:fs/promises'
import { request, type IncomingMessage } from 'node:http'
import { createServer, type AddressInfo } from 'node:net'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { text } from 'node:stream/consumers'
import { setTimeout as sleep } from 'node:timers/promises'
import { DuckDBInstance } from '@duckdb/node-api'
import { createRandom } from '../../src/kernel/stats/index.ts'

const ROWS = 2_592_000
const THREADS = 2

export async function benchIntake(
  print: (text: string) => void,
  options: { main: string; pairs?: number },
): Promise<void> {
  if (!existsSync(options.main)) throw new Error(`${options.main} is not built: run npm run build`)
  const folder = await mkdtemp(join(tmpdir(), 'yawledger-bench-'))
  try {
    const csv = join(folder, 'month.csv')
    writeMonth(csv)
    print(`${ROWS} rows, ${(statSync(csv).size / 1e6).toFixed(0)} MB of CSV`)
    const service = await startService(options.main, join(folder, 'data'))
    try {
      const own: number[] = []
      const bare: number[] = []
      for (let pair = 0; pair < (options.pairs ?? 3); pair++) {
        const site = `bench-${pair}`
        await send(service.port, 'PUT', `/v1/sites/${site}`, 'application/json', '{}')
        own.push(await secondsOf(() => postLog(service.port, site, csv)))
        bare.push(await secondsOf(() => bareCopy(csv, join(folder, `bare-${pair}.parquet`))))
        const ratio = own[pair]! / bare[pair]!
        print(
          `  pair ${pair + 1}: posted in ${own[pair]!.toFixed(2)} s, copied in ${bare[pair]!.toFixed(2)} s, ${ratio.toFixed(2)} x, ` +
            `peak so far ${peakMb(service.child).toFixed(0)} MB`,
        )
      }
      print(
        `posting a month of 1 Hz rows: median ${median(own).toFixed(2)} s, ` +
          `${median(own.map((seconds, i) => seconds / bare[i]!)).toFixed(2)} x a bare copy of ${median(bare).toFixed(2)} s (at most 2), ` +
          `peak ${peakMb(service.child).toFixed(0)} MB (at most 700)`,
      )
    } finally {
      await service.stop()
    }
  } finally {
    await rm(folder, { recursive: true, force: true })
  }
}

/** Values wander as a turbine's do: wind from gust to gust, the nacelle in steps, power by the cube up to the rated one. */
function writeMonth(path: string): void {
  const random = createRandom(1)
  const uniform = () => random.uint32() / 2 ** 32
  const file = openSync(path, 'w')
  try {
    let piece = 'time,turbine,wind_speed,vane,nacelle_position,power\n'
    let wind = 8
    let nacelle = 210
    let vane = 0
    const startMs = Date.UTC(2026, 2, 1)
    for (let i = 0; i < ROWS; i++) {
      wind = Math.abs(wind + 0.02 * (8 - wind) + 0.4 * (uniform() - 0.5))
      vane += 0.05 * -vane + 3 * (uniform() - 0.5)
      if (uniform() < 1 / 300) nacelle = (nacelle + 20 * (uniform() - 0.5) + 360) % 360
      const power = Math.min(2300, 1.9 * wind ** 3)
      const time = new Date(startMs + i * 1000).toISOString()
      piece += `${time.slice(0, 19)}Z,Q01,${wind.toFixed(2)},${vane.toFixed(1)},${nacelle.toFixed(1)},${power.toFixed(1)}\n`
      if (piece.length > 1 << 20) {
        writeSync(file, piece)
        piece = ''
      }
    }
    writeSync(file, piece)
  } finally {
    closeSync(file)
  }
}

async function startService(main: string, dataFolder: string) {
  const port = await freePort()
  const child = spawn(process.execPath, [main, 'serve', '--port', String(port), '--data', dataFolder], {
    // With a pool large enough, the service is this process and not a child of it.
    env: { ...process.env, UV_THREADPOOL_SIZE: '16', YAWLEDGER_LOG_LEVEL: 'warn' },
    stdio: ['ignore', 'inherit', 'inherit'],
  })
  for (let tries = 0; ; tries++) {
    const ready = await send(port, 'GET', '/health/ready').catch(() => undefined)
    if (ready !== undefined) break
    if (child.exitCode !== null || tries > 200) throw new Error('the service did not start')
    await sleep(50)
  }
  return {
    port,
    child,
    async stop() {
      child.kill('SIGTERM')
      if (child.exitCode === null) await once(child, 'exit')
    },
  }
}

async function freePort(): Promise<number> {
  const server = createServer().listen(0, '127.0.0.1')
  await once(server, 'listening')
  const { port } = server.address() as AddressInfo
  server.close()
  await once(server, 'close')
  return port
}

async function postLog(port: number, site: string, csv: string): Promise<void> {
  const answer = await send(port, 'POST', `/v1/sites/${site}/logs`, 'text/csv', createReadStream(csv))
  const accepted = (JSON.parse(answer) as { receipt?: { accepted?: number } }).receipt?.accepted
  if (accepted !== ROWS) throw new Error(`expected ${ROWS} rows accepted, got ${answer.slice(0, 300)}`)
}

async function send(
  port: number,
  method: string,
  path: string,
  type = 'application/json',
  body?: string | NodeJS.ReadableStream,
): Promise<string> {
  const asked = request({ host: '127.0.0.1', port, method, path, headers: { 'content-type': type } })
  if (typeof body === 'object') body.pipe(asked)
  else asked.end(body)
  const [answer] = (await once(asked, 'response')) as [IncomingMessage]
  const got = await text(answer)
  if ((answer.statusCode ?? 500) >= 300)
    throw new Error(`${method} ${path}: ${answer.statusCode ?? ''} ${got.slice(0, 500)}`)
  return got
}

async function bareCopy(csv: string, path: string): Promise<void> {
  const instance = await DuckDBInstance.create(':memory:', { threads: String(THREADS) })
  const connection = await instance.connect()
  await connection.run(`COPY (SELECT * FROM read_csv('${csv}')) TO '${path}' (FORMAT parquet)`)
  connection.closeSync()
  instance.closeSync()
}

/** Most memory that the process ever held, as Linux counts it. */
function peakMb(child: ChildProcess): number {
  const status = readFileSync(`/proc/${child.pid ?? 0}/status`, 'utf8')
  return Number(/VmHWM:\s+(\d+) kB/.exec(status)?.[1] ?? NaN) / 1000
}

async function secondsOf(work: () => Promise<void>): Promise<number> {
  const start = performance.now()
  await work()
  return (performance.now() - start) / 1000
}

function median(values: readonly number[]): number {
  return [...values].sort((a, b) => a - b)[values.length >> 1]!
}
