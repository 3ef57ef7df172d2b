import type { FastifyRequest } from 'fastify'
import PQueue from 'p-queue'
import { InputError } from '../errors.ts'

export interface GateLimits {
  /** Requests whose logs are read and scored at once. */
  readonly atOnce: number
  /** Requests that may wait beyond these. */
  readonly waiting: number
}

/** The client went away before its turn came: there is nobody to answer. */
export class SenderGone extends Error {}

/** A place of one request, held from before its body is taken until its work is done. */
export interface GatePlace {
  /**
   * Runs the work when its turn has come.
   * @throws SenderGone when the client has gone by then; the work has not begun.
   */
  run<T>(work: () => Promise<T>): Promise<T>
  /** For a request that never comes to its turn; afterwards it does nothing. */
  leave(): void
}

/** Bounds how much work is taken on: so many at once, so many that wait, and the next one is told to come back. */
export class ScoringGate {
  readonly #queue: PQueue
  readonly #limits: GateLimits
  #admitted = 0

  constructor(limits: GateLimits) {
    this.#limits = limits
    this.#queue = new PQueue({ concurrency: limits.atOnce })
  }

  /** Requests that have come in whole and wait for their turn. */
  get waiting(): number {
    return this.#queue.size
  }

  /** @throws InputError BUSY when all places are taken. */
  admit(request: FastifyRequest): GatePlace {
    const { atOnce, waiting } = this.#limits
    if (this.#admitted >= atOnce + waiting) {
      throw new InputError(
        'BUSY',
        `service: expected at most ${atOnce + waiting} logs at a time, got one more; post it again later`,
        { detail: { atOnce, waiting } },
      )
    }
    this.#admitted++
    let left = false
    const leave = () => {
      if (!left) this.#admitted--
      left = true
    }
    return {
      // The place is free before the answer is sent: who has the answer may post the next log.
      run: (work) =>
        this.#queue
          .add(() => {
            if (request.raw.socket.destroyed) throw new SenderGone('the sender went away while it waited')
            return work()
          })
          .finally(leave),
      leave,
    }
  }
}
