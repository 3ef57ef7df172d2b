import type { FastifyRequest } from 'fastify'
import Negotiator from 'negotiator'
import { InputError } from '../errors.ts'

/**
 * The kind of answer that the client prefers; the first one when it says nothing or takes anything.
 *
 * @throws InputError NOT_ACCEPTABLE when it takes none of them.
 */
export function acceptedType<T extends string>(request: FastifyRequest, offered: readonly T[]): T {
  const chosen = new Negotiator(request.raw).mediaType([...offered]) as T | undefined
  if (chosen !== undefined) return chosen
  const header = request.headers.accept ?? ''
  throw new InputError(
    'NOT_ACCEPTABLE',
    `Accept: expected ${offered.join(' | ')}, got "${header.slice(0, 200)}"`,
  )
}
