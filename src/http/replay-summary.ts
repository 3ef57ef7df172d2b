import { Type, type Static } from 'typebox'
import type { ReplayRecord } from '../replay/contract.ts'
import { ReplayState } from '../sheet/index.ts'
import { addressOf, isoTime } from './answers.ts'

const Time = (description: string) => Type.String({ format: 'date-time', description })

export const ReplaySummary = Type.Object(
  {
    replay: Type.String({ description: 'id' }),
    state: ReplayState,
    site: Type.Union([Type.String(), Type.Null()]),
    createdAt: Time('when it was posted'),
    finishedAt: Type.Union([Time('when it ended'), Type.Null()], { description: 'null while it runs' }),
    progress: Type.Union(
      [
        Type.Object({
          stage: Type.Union([
            Type.Literal('reading'),
            Type.Literal('framing'),
            Type.Literal('examining'),
            Type.Literal('scoring'),
            Type.Literal('writing'),
          ]),
          share: Type.Number({ minimum: 0, maximum: 1, description: 'of the stage' }),
        }),
        Type.Null(),
      ],
      { description: 'how far it is; null unless it runs' },
    ),
    problem: Type.Union([Type.Object({ code: Type.String(), detail: Type.String() }), Type.Null()], {
      description: 'why it failed; null otherwise',
    }),
    href: Type.String({ description: 'where its score sheet or state is read' }),
  },
  { description: 'State of a replay' },
)

export function replayAddress(id: string): string {
  return addressOf('replays', id)
}

export function replaySummary(record: ReplayRecord): Static<typeof ReplaySummary> {
  return {
    replay: record.id,
    state: record.state,
    site: record.site,
    createdAt: isoTime(record.createdMs),
    finishedAt: record.finishedMs === null ? null : isoTime(record.finishedMs),
    progress: record.progress,
    problem: record.problem,
    href: replayAddress(record.id),
  }
}
