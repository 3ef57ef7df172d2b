import { setMaxListeners } from 'node:events'
import { InputError } from '../errors.ts'
import type { Progress } from './contract.ts'

/** A replay that waits or runs in this process. */
export interface Run {
  readonly signal: AbortSignal
  readonly onProgress: (progress: Progress) => void
}

/** Which replays this process has in hand, how far they are, and how to stop them. */
export class RunningReplays {
  readonly #runs = new Map<string, { controller: AbortController; progress: Progress | null }>()
  readonly #active = new Set<Promise<unknown>>()
  #isClosed = false

  /**
   * Notes a replay before anything of it is done.
   * @throws InputError NOT_READY when the service is stopping
   */
  enter(id: string, onProgress: (progress: Progress) => void = () => undefined): Run {
    if (this.#isClosed)
      throw new InputError('NOT_READY', 'replays: expected a running service, got one that stops')
    const run = { controller: new AbortController(), progress: null as Progress | null }
    setMaxListeners(0, run.controller.signal) // one for every turbine that waits, by design
    this.#runs.set(id, run)
    return {
      signal: run.controller.signal,
      onProgress: (progress) => {
        run.progress = progress
        onProgress(progress)
      },
    }
  }

  /** Runs the work of a replay that has entered, and lets it go. */
  async carry<T>(id: string, work: () => Promise<T>): Promise<T> {
    const promise = work()
    this.#active.add(promise)
    try {
      return await promise
    } finally {
      this.#active.delete(promise)
      this.#runs.delete(id)
    }
  }

  has(id: string): boolean {
    return this.#runs.has(id)
  }

  leave(id: string): void {
    this.#runs.delete(id)
  }

  progress(id: string): Progress | null {
    return this.#runs.get(id)?.progress ?? null
  }

  cancel(id: string): void {
    this.#runs.get(id)?.controller.abort(new InputError('INTERRUPTED', 'replay: it was cancelled'))
  }

  /** Stops everything and waits until it has stopped. */
  async close(): Promise<void> {
    this.#isClosed = true
    for (const { controller } of this.#runs.values())
      controller.abort(new InputError('INTERRUPTED', 'replay: the service stops'))
    await Promise.allSettled([...this.#active])
  }
}
