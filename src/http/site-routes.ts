import type { FastifyReply } from 'fastify'
import { Type } from 'typebox'
import type { ErrorCode } from '../errors.ts'
import type { Setup } from '../setup/index.ts'
import { TurbineSetup } from '../sheet/index.ts'
import {
  addressOf,
  ETAG,
  IfNoneMatch,
  jsonResponse,
  Next,
  NOT_MODIFIED,
  pageOf,
  PageQuery,
  sendTagged,
  SERVICE_CODES,
  SiteParams,
  TurbineParams,
} from './answers.ts'
import { receiveJson } from './json-body.ts'
import { jsonBody } from './log-bodies.ts'
import { problemResponses } from './problem.ts'
import type { TypedServer } from './typed-server.ts'

export interface SiteRouteParts {
  readonly setup: Setup
  /** Silence after which a sender is given up, ms. */
  readonly idleMs: number
}

const PUT_CODES = [
  'BAD_OPTION',
  'BAD_REQUEST',
  'BAD_SITE',
  'BODY_TOO_LARGE',
  'UNSUPPORTED_MEDIA_TYPE',
  'STORAGE_FULL',
  ...SERVICE_CODES,
] as const satisfies readonly ErrorCode[]

const LOCATION = { Location: { schema: { type: 'string' }, description: 'where it is read again' } }

const SitePage = Type.Object(
  {
    sites: Type.Array(Type.Object({ site: Type.String(), href: Type.String() }), {
      description: 'by name, in byte order',
    }),
    next: Next,
  },
  { description: 'A page of sites' },
)

/** PUT, GET and DELETE of sites and of their turbines. */
export function siteRoutes(app: TypedServer, { setup, idleMs }: SiteRouteParts): void {
  app.put(
    '/v1/sites/:site',
    {
      schema: {
        operationId: 'putSite',
        tags: ['sites'],
        summary: 'Set up a site',
        description:
          'The site file, whole, in place of an older one; stored logs stay. It is the document that the command line takes by `--site`. A `site` in it must be the name in the address.',
        params: SiteParams,
        body: jsonBody({ $ref: 'SiteFile#' }),
        response: {
          200: jsonResponse('Replaced', { $ref: 'SiteFile#' }, ETAG),
          201: jsonResponse('New', { $ref: 'SiteFile#' }, { ...ETAG, ...LOCATION }),
          ...problemResponses(PUT_CODES),
        },
      },
    },
    async (request, reply) => {
      const { site } = request.params
      const { file, isNew } = await setup.putSite(site, await receiveJson(request, idleMs))
      if (isNew) reply.code(201).header('location', addressOf('sites', site))
      return await sendTagged(request, reply, JSON.stringify(file))
    },
  )
  app.get(
    '/v1/sites/:site',
    {
      schema: {
        operationId: 'readSite',
        tags: ['sites'],
        summary: 'Read the site file',
        description: 'With the turbines that posted logs have added.',
        params: SiteParams,
        headers: IfNoneMatch,
        response: {
          200: jsonResponse('The site file', { $ref: 'SiteFile#' }, ETAG),
          ...NOT_MODIFIED,
          ...problemResponses(['BAD_OPTION', 'SITE_NOT_FOUND', ...SERVICE_CODES]),
        },
      },
    },
    async (request, reply) =>
      sendTagged(request, reply, JSON.stringify(await setup.getSite(request.params.site))),
  )
  app.get(
    '/v1/sites',
    {
      schema: {
        operationId: 'listSites',
        tags: ['sites'],
        summary: 'List sites',
        querystring: Type.Object(PageQuery, { additionalProperties: false }),
        headers: IfNoneMatch,
        response: {
          200: jsonResponse('A page of sites', SitePage, ETAG),
          ...NOT_MODIFIED,
          ...problemResponses(['BAD_OPTION', 'BAD_REQUEST', ...SERVICE_CODES]),
        },
      },
    },
    async (request, reply) => {
      const { sites, next } = await setup.listSites(pageOf(request.query))
      const listed = sites.map((site) => ({ site, href: addressOf('sites', site) }))
      return await sendTagged(request, reply, JSON.stringify({ sites: listed, next }))
    },
  )
  app.delete(
    '/v1/sites/:site',
    {
      schema: {
        operationId: 'removeSite',
        tags: ['sites'],
        summary: 'Remove a site with all its logs',
        description: 'Score sheets stay, as they are answers that somebody may have acted on.',
        params: SiteParams,
        response: {
          204: { description: 'Removed' },
          ...problemResponses(['BAD_OPTION', 'SITE_NOT_FOUND', ...SERVICE_CODES]),
        },
      },
    },
    async (request, reply) => {
      await setup.removeSite(request.params.site)
      return await (reply as FastifyReply).code(204).send()
    },
  )
  turbineRoutes(app, { setup, idleMs })
}

function turbineRoutes(app: TypedServer, { setup, idleMs }: SiteRouteParts): void {
  const path = '/v1/sites/:site/turbines/:turbine'
  app.put(
    path,
    {
      schema: {
        operationId: 'putTurbine',
        tags: ['sites'],
        summary: 'Set up a turbine',
        description:
          'An entry of `turbines` of the site file. A `turbine` in it must be the name in the address.',
        params: TurbineParams,
        body: jsonBody(Type.Partial(TurbineSetup)),
        response: {
          200: jsonResponse('Replaced', TurbineSetup, ETAG),
          201: jsonResponse('New', TurbineSetup, { ...ETAG, ...LOCATION }),
          ...problemResponses(['SITE_NOT_FOUND', ...PUT_CODES]),
        },
      },
    },
    async (request, reply) => {
      const { site, turbine } = request.params
      const put = await setup.putTurbine(site, turbine, await receiveJson(request, idleMs))
      if (put.isNew) reply.code(201).header('location', addressOf('sites', site, 'turbines', turbine))
      return await sendTagged(request, reply, JSON.stringify(put.setup))
    },
  )
  const codes = ['BAD_OPTION', 'SITE_NOT_FOUND', 'TURBINE_NOT_FOUND', ...SERVICE_CODES] as const
  app.get(
    path,
    {
      schema: {
        operationId: 'readTurbine',
        tags: ['sites'],
        summary: 'Read the set-up of a turbine',
        params: TurbineParams,
        headers: IfNoneMatch,
        response: {
          200: jsonResponse('The set-up', TurbineSetup, ETAG),
          ...NOT_MODIFIED,
          ...problemResponses(codes),
        },
      },
    },
    async (request, reply) => {
      const { site, turbine } = request.params
      return sendTagged(request, reply, JSON.stringify(await setup.getTurbine(site, turbine)))
    },
  )
  app.delete(
    path,
    {
      schema: {
        operationId: 'removeTurbine',
        tags: ['sites'],
        summary: 'Remove the set-up of a turbine',
        description: 'Rows of its logs stay.',
        params: TurbineParams,
        response: { 204: { description: 'Removed' }, ...problemResponses(codes) },
      },
    },
    async (request, reply) => {
      await setup.removeTurbine(request.params.site, request.params.turbine)
      return await (reply as FastifyReply).code(204).send()
    },
  )
}
