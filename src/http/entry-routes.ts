import type { FastifyReply } from 'fastify'
import { Type, type TSchema } from 'typebox'
import type { EntryList, SiteEntry } from '../setup/index.ts'
import type { Replays } from '../replay/contract.ts'
import { CorrectionProof, SiteFile } from '../sheet/index.ts'
import {
  addressOf,
  ETAG,
  IfNoneMatch,
  jsonResponse,
  Name,
  NOT_MODIFIED,
  sendJson,
  sendTagged,
  SERVICE_CODES,
  SiteParams,
} from './answers.ts'
import { receiveJson } from './json-body.ts'
import { jsonBody } from './log-bodies.ts'
import { problemResponses } from './problem.ts'
import type { SiteRouteParts } from './site-routes.ts'
import type { TypedServer } from './typed-server.ts'

export interface EntryRouteParts extends SiteRouteParts {
  readonly replays: Pick<Replays, 'proofs'>
}

const LISTS: Readonly<Record<EntryList, { one: string; Name: string; meaning: string }>> = {
  corrections: {
    one: 'a correction',
    Name: 'Correction',
    meaning: 'What was entered into a controller, and when.',
  },
  events: {
    one: 'an event',
    Name: 'Event',
    meaning: 'Vane or anemometer replaced, controller software, blade work: they split periods.',
  },
  exclude: {
    one: 'a time that is left out',
    Name: 'Exclusion',
    meaning: 'Rows of these times are set aside.',
  },
}

/** The lists of a site file that grow entry by entry: corrections, events, times that are left out. */
export function entryRoutes(app: TypedServer, parts: EntryRouteParts): void {
  for (const list of Object.keys(LISTS) as EntryList[]) listRoutes(app, parts, list)
}

const Proof = Type.Union([CorrectionProof, Type.Null()], {
  description: 'what became of it, by the newest replay that could judge it; null: no replay holds its time',
})

function listRoutes(app: TypedServer, { setup, idleMs, replays }: EntryRouteParts, list: EntryList): void {
  const { one, Name: upper, meaning } = LISTS[list]
  const Bare = SiteFile.properties[list].items as TSchema & { properties: Record<string, TSchema> }
  const Entry = Type.Object({
    id: Type.String({ description: 'follows from what the entry says: the same entry, the same id' }),
    ...Bare.properties,
  })
  const Listed = list === 'corrections' ? Type.Object({ ...Entry.properties, proof: Proof }) : Entry
  const path = `/v1/sites/:site/${list}`
  app.post(
    path,
    {
      schema: {
        operationId: `add${upper}`,
        tags: ['sites'],
        summary: `Add ${one}`,
        description: `${meaning} It goes into \`${list}\` of the site file, which is kept in the order of time. One that is there already is not added again.`,
        params: SiteParams,
        body: jsonBody(Bare),
        response: {
          200: jsonResponse('It was there already', Entry),
          201: jsonResponse('Added', Entry, {
            Location: { schema: { type: 'string' }, description: 'where it can be removed' },
          }),
          ...problemResponses([
            'BAD_OPTION',
            'BAD_REQUEST',
            'BAD_SITE',
            'SITE_NOT_FOUND',
            'BODY_TOO_LARGE',
            'UNSUPPORTED_MEDIA_TYPE',
            'STORAGE_FULL',
            ...SERVICE_CODES,
          ]),
        },
      },
    },
    async (request, reply) => {
      const { site } = request.params
      const { entry, isNew } = await setup.addEntry(site, list, await receiveJson(request, idleMs))
      if (isNew) reply.code(201).header('location', addressOf('sites', site, list, entry.id))
      return sendJson(reply, entry)
    },
  )
  app.get(
    path,
    {
      schema: {
        operationId: `list${upper}s`,
        tags: ['sites'],
        summary: `List \`${list}\` of a site`,
        description:
          list === 'corrections'
            ? 'All of them, in the order of time, with what became of each: `proof` is that of the newest replay that could judge it.'
            : 'All of them, in the order of time.',
        params: SiteParams,
        headers: IfNoneMatch,
        response: {
          200: jsonResponse('The list', Type.Object({ [list]: Type.Array(Listed) }), ETAG),
          ...NOT_MODIFIED,
          ...problemResponses(['BAD_OPTION', 'SITE_NOT_FOUND', ...SERVICE_CODES]),
        },
      },
    },
    async (request, reply) => {
      const { site } = request.params
      const entries = await setup.listEntries(site, list)
      const listed = list === 'corrections' ? await withProofs(site, entries, replays) : entries
      return sendTagged(request, reply, JSON.stringify({ [list]: listed }))
    },
  )
  app.delete(
    `${path}/:id`,
    {
      schema: {
        operationId: `remove${upper}`,
        tags: ['sites'],
        summary: `Remove ${one}`,
        params: Type.Object({ site: Name('name of the site'), id: Name('id of the entry') }),
        response: {
          204: { description: 'Removed' },
          ...problemResponses(['BAD_OPTION', 'SITE_NOT_FOUND', 'ENTRY_NOT_FOUND', ...SERVICE_CODES]),
        },
      },
    },
    async (request, reply) => {
      await setup.removeEntry(request.params.site, list, request.params.id)
      return await (reply as FastifyReply).code(204).send()
    },
  )
}

async function withProofs(
  site: string,
  entries: readonly SiteEntry<EntryList>[],
  replays: EntryRouteParts['replays'],
): Promise<object[]> {
  const proofs = entries.length === 0 ? [] : await replays.proofs(site)
  return (entries as SiteEntry<'corrections'>[]).map((entry) => ({
    ...entry,
    proof:
      proofs.find(
        ({ turbine, at, enteredDeg }) =>
          turbine === entry.turbine &&
          enteredDeg === entry.enteredDeg &&
          Date.parse(at) === Date.parse(entry.at),
      ) ?? null,
  }))
}
