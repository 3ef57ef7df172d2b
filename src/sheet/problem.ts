import { Type, type Static } from 'typebox'

/** RFC 9457 problem details, with this program's code. */
export const Problem = Type.Object(
  {
    type: Type.String({ description: 'a URI reference that names the kind of problem' }),
    title: Type.String(),
    status: Type.Integer({ minimum: 400, maximum: 599 }),
    code: Type.String(),
    detail: Type.String(),
    instance: Type.Optional(Type.String()),
    requestId: Type.Optional(Type.String()),
    context: Type.Optional(Type.Record(Type.String(), Type.Unknown())),
  },
  { description: 'Problem' },
)
export type Problem = Static<typeof Problem>
