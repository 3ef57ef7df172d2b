import { availableParallelism } from 'node:os'
import { setImmediate } from 'node:timers/promises'
import PQueue from 'p-queue'
import type { Scorers } from './scorers.ts'

/**
 * Scorers that stop at a signal: no more turbines are handed on than can be worked on, so that a replay that is cancelled
 * leaves no long queue behind it.
 */
export function guardedScorers(scorers: Scorers, signal: AbortSignal): Pick<Scorers, 'score'> {
  const queue = new PQueue({ concurrency: availableParallelism() + 1 })
  return {
    score: (task) =>
      queue.add(
        async () => {
          await setImmediate() // where scoring runs on this thread, a request to cancel gets in between
          signal.throwIfAborted()
          return scorers.score(task)
        },
        { signal },
      ),
  }
}
