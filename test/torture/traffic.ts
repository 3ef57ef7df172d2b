import { gzipSync } from 'node:zlib'
import type { RandomSource } from '../../src/kernel/stats/index.ts'
import { SITE, TURBINES, type Ledger, type SentLog, type StoredLog } from './ledger.ts'
import type { Service } from './service.ts'

const FIRST_MS = Date.UTC(2020, 0, 1)
/** Refusals of a service that has too much to do. */
const BUSY = 503

/** Sends a log of new minutes, or one that corrects a stored log; now and then with a line that is no row, or compressed. */
export async function post(
  service: Service,
  ledger: Ledger,
  random: RandomSource,
  minutes: number,
): Promise<void> {
  const n = ledger.nextNumber()
  const stored = ledger.stored()
  const corrected = random.below(6) === 0 ? stored[random.below(Math.max(1, stored.length))] : undefined
  const log: SentLog = {
    n,
    firstMs: corrected?.firstMs ?? FIRST_MS + ledger.nextMinute * 60_000,
    minutes: corrected?.minutes ?? minutes,
    hasRejected: random.below(3) === 0,
  }
  if (!corrected) ledger.nextMinute += minutes
  const body = Buffer.from(`${logLines(log).join('\n')}\n`)
  const isGzip = random.below(3) === 0
  ledger.sending(log)
  const answer = await service.send(
    'POST',
    `/v1/sites/${SITE}/logs?name=log-${n}.csv`,
    isGzip ? gzipSync(body) : body,
    isGzip ? 'application/gzip' : 'text/csv',
  )
  if (answer.status === BUSY) {
    ledger.refused(n)
    return
  }
  if (answer.status !== 201)
    throw new Error(`log ${n}: expected 201, got ${answer.status} ${answer.body.slice(0, 500)}`)
  ledger.acknowledged(n, JSON.parse(answer.body) as StoredLog)
}

/** Values that a number of binary digits holds whole, so that what is read back can be compared without a tolerance. */
export function logLines(log: SentLog): string[] {
  const lines = ['time,turbine,wind_speed (m/s),vane (deg),power (kW)']
  for (let k = 0; k < log.minutes; k++) {
    const time = new Date(log.firstMs + k * 60_000).toISOString()
    for (const turbine of TURBINES) {
      lines.push(`${time},${turbine},${4 + (k % 80) / 8},${(k % 41) / 4 - 5},${1000 + log.n / 8}`)
    }
  }
  if (log.hasRejected) lines.push(`never,${TURBINES[0]!},8,0,1000`)
  return lines
}

/** Scores a small log, or a window of what is stored. */
export async function postReplay(service: Service, ledger: Ledger, random: RandomSource): Promise<void> {
  const stored = ledger.stored()
  const one = random.below(2) === 0 ? stored[random.below(Math.max(1, stored.length))] : undefined
  const answer = one
    ? await service.send(
        'POST',
        '/v1/replays',
        JSON.stringify({
          site: SITE,
          from: new Date(one.firstMs).toISOString(),
          to: new Date(one.firstMs + 60 * 60_000).toISOString(),
        }),
      )
    : await service.send(
        'POST',
        '/v1/replays',
        `${logLines({ n: 1, firstMs: FIRST_MS, minutes: 300, hasRejected: false }).join('\n')}\n`,
        'text/csv',
      )
  if (answer.status === BUSY) return
  // A log that is removed meanwhile leaves a window without rows.
  if (one && answer.status >= 400 && answer.status < 500) return
  if (answer.status !== 201)
    throw new Error(`replay: expected 201, got ${answer.status} ${answer.body.slice(0, 500)}`)
  ledger.sheets.set((JSON.parse(answer.body) as { replay: string }).replay, answer.body)
}

/** Removes a stored log, and rests. */
export async function removeOne(service: Service, ledger: Ledger, random: RandomSource): Promise<void> {
  await new Promise((done) => setTimeout(done, 200 + random.below(800)))
  const stored = ledger.stored()
  const one = stored[random.below(Math.max(1, stored.length))]
  if (!one) return
  const batch = ledger.removing(one.n)
  const answer = await service.send('DELETE', `/v1/sites/${SITE}/logs/${batch}`)
  if (answer.status !== 204)
    throw new Error(`removal: expected 204, got ${answer.status} ${answer.body.slice(0, 500)}`)
  ledger.removed(one.n)
}
