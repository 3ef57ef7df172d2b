import type { FastifyInstance } from 'fastify'
import { InputError } from '../errors.ts'

/** Notes the routes of a server as they are added, to tell an unknown address (404) from a wrong method (405). */
export class KnownAddresses {
  readonly #routes: { pattern: RegExp; methods: string[] }[] = []

  constructor(app: FastifyInstance) {
    app.addHook('onRoute', (route) => {
      const pattern = route.url.replaceAll(/[.*+?^${}()|[\]\\]/g, '\\$&').replaceAll(/:\w+/g, '[^/]+')
      this.#routes.push({ pattern: new RegExp(`^${pattern}$`), methods: [route.method].flat() })
    })
  }

  /** Methods that the address takes; none when there is no such address. */
  methodsOf(path: string): string[] {
    const methods = this.#routes.filter(({ pattern }) => pattern.test(path)).flatMap((route) => route.methods)
    return [...new Set(methods)].sort()
  }

  /** Why a request found no route. */
  refusal(method: string, path: string): InputError {
    const allowed = this.methodsOf(path)
    if (allowed.length > 0) {
      return new InputError('METHOD_NOT_ALLOWED', `method: expected ${allowed.join(' or ')}, got ${method}`)
    }
    const shown = path.slice(0, 200)
    return new InputError('NOT_FOUND', `address: expected one that /openapi.json lists, got "${shown}"`)
  }
}
