import { Type } from 'typebox'
import type { Replays, RowsFormat } from '../replay/contract.ts'
import { acceptedType } from './accept.ts'
import { ETAG, IfNoneMatch, Name, NOT_MODIFIED, SERVICE_CODES } from './answers.ts'
import { matchesTag } from './etag.ts'
import { problemResponses } from './problem.ts'
import type { TypedServer } from './typed-server.ts'

const FORMATS: Readonly<Record<string, RowsFormat>> = {
  'text/csv': 'csv',
  'application/vnd.apache.parquet': 'parquet',
  'application/vnd.apache.arrow.stream': 'arrow',
}

/** Every row of a replay with the reason it was set aside. */
export function rowsRoute(app: TypedServer, { replays }: { replays: Replays }): void {
  const binary = { schema: { type: 'string', format: 'binary' } }
  app.get(
    '/v1/replays/:id/rows',
    {
      schema: {
        operationId: 'readRows',
        tags: ['replays'],
        summary: 'Read every row of a replay',
        description:
          'Every row with the reason it was set aside, or `used`: turbine by turbine, by time. CSV unless `Accept` or `format` ask for Parquet or an Arrow stream. Rows are kept for as many days as the service is told to; then the answer is 410.',
        params: Type.Object({ id: Name('id of the replay') }),
        querystring: Type.Object(
          {
            format: Type.Optional(
              Type.Union([Type.Literal('csv'), Type.Literal('parquet'), Type.Literal('arrow')], {
                description: 'wins over `Accept`',
              }),
            ),
          },
          { additionalProperties: false },
        ),
        headers: IfNoneMatch,
        response: {
          200: {
            description: 'The rows',
            headers: ETAG,
            content: {
              'text/csv': { schema: { type: 'string' } },
              'application/vnd.apache.parquet': binary,
              'application/vnd.apache.arrow.stream': binary,
            },
          },
          ...NOT_MODIFIED,
          ...problemResponses([
            'BAD_OPTION',
            'REPLAY_NOT_FOUND',
            'FRAME_GONE',
            'NOT_ACCEPTABLE',
            'STORAGE_FULL',
            ...SERVICE_CODES,
          ]),
        },
      },
    },
    async (request, reply) => {
      const { id } = request.params
      const format = request.query.format ?? FORMATS[acceptedType(request, Object.keys(FORMATS))] ?? 'csv'
      const record = await replays.get(id)
      // The rows of a replay never change, so its id and the format name them.
      const tag = `"rows-${id}-${format}"`
      reply.header('etag', tag).header('cache-control', 'no-cache').header('vary', 'accept')
      if (record.sheet !== null && matchesTag(request.headers['if-none-match'], tag)) {
        return reply.code(304).send()
      }
      const { stream, mediaType } = await replays.rows(id, format).catch((error: unknown) => {
        reply.removeHeader('etag')
        throw error
      })
      if (request.method === 'HEAD') stream.destroy()
      reply
        .header('content-type', mediaType)
        .header('content-disposition', `attachment; filename="${id}.${format}"`)
      return request.method === 'HEAD' ? reply.send() : reply.send(stream)
    },
  )
}
