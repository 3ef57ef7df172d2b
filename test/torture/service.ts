import { spawn, type ChildProcess } from 'node:child_process'
import { once } from 'node:events'
import { readFileSync } from 'node:fs'
import { request, type IncomingMessage } from 'node:http'
import { createServer, type AddressInfo } from 'node:net'
import { text } from 'node:stream/consumers'
import { setTimeout as sleep } from 'node:timers/promises'

export interface Answer {
  readonly status: number
  readonly body: string
}

export interface Service {
  readonly child: ChildProcess
  /** From the start of the process to the first 200 of /health/ready, s; NaN when it ended before. */
  readonly readyS: number
  /** How much of that its main thread waited for a processor that others held, s; 0 where the system does not say. */
  readonly waitedS: number
  send(method: string, path: string, body?: string | Buffer, type?: string): Promise<Answer>
  /** Asks it to stop and waits. @throws Error when it does not end with 0 */
  stop(): Promise<void>
  /** kill -9 and wait. */
  kill(): Promise<void>
}

const NEVER_READY_MS = 60_000

/** Services do not outlive this process, also where a check breaks off. */
const running = new Set<ChildProcess>()
process.on('exit', () => {
  for (const child of running) child.kill('SIGKILL')
})

/**
 * Starts a service of its own process and waits until it is ready.
 * @param options.killAfterMs  kill it this long after its start, ready or not
 */
export async function startService(options: {
  main: string
  folder: string
  killAfterMs?: number
}): Promise<Service> {
  const port = await freePort()
  const args = [options.main, 'serve', '--port', String(port), '--data', options.folder]
  const startMs = performance.now()
  const child = spawn(process.execPath, args, {
    // With a pool large enough, the service is this process and not a child of it.
    env: { ...process.env, UV_THREADPOOL_SIZE: '16', YAWLEDGER_LOG_LEVEL: 'error' },
    stdio: ['ignore', 'inherit', 'inherit'],
  })
  const ended = once(child, 'exit') as Promise<[number | null, NodeJS.Signals | null]>
  running.add(child)
  void ended.then(() => running.delete(child))
  const isRunning = () => child.exitCode === null && child.signalCode === null
  const timer =
    options.killAfterMs === undefined
      ? undefined
      : setTimeout(() => child.kill('SIGKILL'), options.killAfterMs)
  const ask: Service['send'] = (method, path, body, type) => send(port, method, path, body, type)
  let readyS = NaN
  let waitedS = 0
  while (isRunning()) {
    const answer = await ask('GET', '/health/ready').catch(() => undefined)
    const waitedMs = performance.now() - startMs
    if (answer?.status === 200) {
      readyS = waitedMs / 1000
      waitedS = waitedForProcessorS(child.pid)
      break
    }
    if (waitedMs > NEVER_READY_MS) {
      child.kill('SIGKILL')
      throw new Error(`service: expected to be ready within ${NEVER_READY_MS} ms`)
    }
    await sleep(10)
  }
  return {
    child,
    readyS,
    waitedS,
    send: ask,
    async stop() {
      clearTimeout(timer)
      child.kill('SIGTERM')
      const [code, signal] = await ended
      if (code !== 0) throw new Error(`service: expected to end with 0, got ${signal ?? code ?? ''}`)
    },
    async kill() {
      clearTimeout(timer)
      child.kill('SIGKILL')
      await ended
    },
  }
}

/** Linux counts for each thread the nanoseconds that it was ready to run and did not. */
function waitedForProcessorS(pid: number | undefined): number {
  try {
    return Number(readFileSync(`/proc/${pid ?? 0}/schedstat`, 'utf8').split(' ')[1]) / 1e9
  } catch {
    return 0
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

async function send(
  port: number,
  method: string,
  path: string,
  body?: string | Buffer,
  type = 'application/json',
): Promise<Answer> {
  const headers = body === undefined ? {} : { 'content-type': type }
  const asked = request({ host: '127.0.0.1', port, method, path, headers, agent: false })
  asked.end(body)
  const [answer] = (await once(asked, 'response')) as [IncomingMessage]
  return { status: answer.statusCode ?? 0, body: await text(answer) }
}
