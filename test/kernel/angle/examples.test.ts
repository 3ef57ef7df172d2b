import { readdirSync, readFileSync } from 'node:fs'
import path from 'node:path'
import { runInNewContext } from 'node:vm'
import { expect, test } from 'vitest'
import * as angle from '../../../src/kernel/angle/index.ts'

const FOLDER = path.join(import.meta.dirname, '../../../src/kernel/angle')
const examples = readdirSync(FOLDER).flatMap((file) =>
  Array.from(
    readFileSync(path.join(FOLDER, file), 'utf8').matchAll(/@example (?<call>.+?) \/\/ (?<result>.+)/g),
    ({ groups }) => ({ call: groups!.call!, result: groups!.result! }),
  ),
)

test('the docstrings hold examples', () => {
  expect(examples.length).toBeGreaterThan(15)
})

test.each(examples)('example in a docstring: $call', ({ call, result }) => {
  const run = (code: string): unknown => runInNewContext(`JSON.stringify(${code}, (_, x) => Object.is(x, Infinity) ? 'Infinity' : x)`, { ...angle }) // prettier-ignore
  const got = JSON.parse(run(call) as string) as unknown
  const expected = JSON.parse(run(result) as string) as unknown
  if (typeof expected === 'number') expect(got).toBeCloseTo(expected, 9)
  else if (Array.isArray(expected)) {
    expect(got).toEqual(expected.map((x: number) => expect.closeTo(x, 9) as number))
  } else expect(got).toBe(expected)
})
