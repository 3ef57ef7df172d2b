import type { FastifyDynamicSwaggerOptions } from '@fastify/swagger'
import { stringify } from 'yaml'
import { problemResponse } from './problem.ts'
import type { TypedServer } from './typed-server.ts'

/** The head of the interface description; paths and schemas come from the routes. */
export function documentInfo(version: string): NonNullable<FastifyDynamicSwaggerOptions['openapi']> {
  return {
    openapi: '3.1.0',
    info: {
      title: 'yawledger',
      version,
      summary: 'Replays wind-turbine SCADA yaw logs and scores misalignment',
      description: [
        'Post a month of logs, get a score sheet: by how many degrees each rotor stands off the wind, what that costs, what to enter, and where every row went.',
        '',
        'Signs: a positive misalignment means that the nacelle must stand that many degrees further clockwise, seen from above; it is added to the vane reading.',
        'Units stand at the end of names (`Deg`, `Ms`, `Kw`, `Mwh`, `S`). `null` means not known, and never zero. Times are ISO 8601; the time of a row is the start of its interval.',
        '',
        'Reads carry `ETag`, and answer `If-None-Match` with 304. Lists come in pages: `next` of one is `after` of the following.',
        'Errors are problem details (RFC 9457) with a stable `code`. An unknown address answers 404 `NOT_FOUND`, a wrong method 405 `METHOD_NOT_ALLOWED` with `Allow`.',
        'Every answer carries `X-Request-Id`; one that is sent along is used.',
      ].join('\n'),
    },
    servers: [{ url: 'http://127.0.0.1:8080' }],
    tags: [
      { name: 'replays', description: 'Score logs' },
      { name: 'sites', description: 'What is known about a site and its turbines' },
      { name: 'logs', description: 'Store logs, and account for them' },
      { name: 'answers', description: 'Latest answers, for dashboards' },
      { name: 'operations', description: 'For those who run the service' },
    ],
    components: {
      responses: {
        NotFound: problemResponse(['NOT_FOUND'], '#/components/schemas/Problem') as never,
        MethodNotAllowed: problemResponse(['METHOD_NOT_ALLOWED'], '#/components/schemas/Problem') as never,
      },
    },
  }
}

/** The interface description as the repository keeps it. */
export function openapiYaml(app: TypedServer): string {
  const document = JSON.parse(JSON.stringify(app.swagger())) as object
  const head = '# Generated from the route schemas by `npm run openapi`. Changes are made there.\n'
  return head + stringify(document, { lineWidth: 0, aliasDuplicateObjects: false })
}
