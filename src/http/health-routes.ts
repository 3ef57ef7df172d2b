import { Type } from 'typebox'
import { InputError } from '../errors.ts'
import { problemResponses } from './problem.ts'
import type { TypedServer } from './typed-server.ts'

/** Resolves while work can be taken. Rejects, or throws, with the reason while it cannot. */
export type ReadyCheck = () => Promise<void>

/** Whether the process runs, and whether it can take work. Neither needs any right, and neither fills the log. */
export function healthRoutes(app: TypedServer, ready: ReadyCheck): void {
  app.get(
    '/health/live',
    {
      logLevel: 'warn',
      schema: {
        operationId: 'live',
        tags: ['operations'],
        summary: 'Whether the process runs',
        response: { 200: okResponse('It runs', 'live') },
      },
    },
    () => ({ status: 'live' }),
  )
  app.get(
    '/health/ready',
    {
      logLevel: 'warn',
      schema: {
        operationId: 'ready',
        tags: ['operations'],
        summary: 'Whether the service can take work',
        description: 'Not ready while it starts or stops, or while the data folder cannot be written.',
        response: { 200: okResponse('It can', 'ready'), ...problemResponses(['NOT_READY']) },
      },
    },
    async (request) => {
      try {
        await ready()
      } catch (cause) {
        request.log.warn({ err: cause }, 'not ready')
        throw new InputError('NOT_READY', 'service: expected to be ready, got a check that failed', { cause })
      }
      return { status: 'ready' }
    },
  )
}

function okResponse(description: string, status: string): object {
  return {
    description,
    content: { 'application/json': { schema: Type.Object({ status: Type.Literal(status) }) } },
  }
}
