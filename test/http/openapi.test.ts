import { readFileSync } from 'node:fs'
import { Ajv2020 } from 'ajv/dist/2020.js'
import addFormatsModule from 'ajv-formats'
import { afterAll, beforeAll, expect, test } from 'vitest'
import { parse } from 'yaml'
import { ERRORS, type ErrorCode } from '../../src/errors.ts'
import { openapiYaml } from '../../src/http/index.ts'
import { startServer, type StartedServer } from './started-server.ts'

interface Operation {
  operationId: string
  parameters?: { name: string; in: string }[]
  responses: Record<string, { content?: Record<string, unknown> }>
}
interface Document {
  openapi: string
  paths: Record<string, Record<string, Operation>>
  components: { schemas: Record<string, object> }
}

const yaml = readFileSync(new URL('../../openapi.yaml', import.meta.url), 'utf8')
const document = parse(yaml) as Document

const ajv = new Ajv2020({ strict: false, allErrors: true, validateSchema: false })
addFormatsModule.default(ajv)
ajv.addSchema({ ...document, $id: 'openapi' })

let server: StartedServer
beforeAll(async () => {
  server = await startServer()
})
afterAll(async () => {
  await server.stop()
})

/** Codes that only the command line meets, or that no route answers yet. */
const NOT_BY_HTTP: readonly ErrorCode[] = [
  'BAD_CONFIG',
  'LOG_NOT_FOUND',
  'SITE_NOT_FOUND',
  'TURBINE_NOT_FOUND',
  'BATCH_NOT_FOUND',
]

test('the committed description is what the routes say', () => {
  expect(openapiYaml(server.app)).toBe(yaml)
})

test('the codes of the description and the codes of the error table are the same', () => {
  const listed = new Set<string>()
  const collect = (node: unknown): void => {
    if (typeof node !== 'object' || node === null) return
    for (const [key, value] of Object.entries(node)) {
      const codes = key === 'code' ? (value as { enum?: string[] }).enum : undefined
      for (const code of codes ?? []) listed.add(code)
      collect(value)
    }
  }
  collect(document)
  const answerable = Object.keys(ERRORS).filter((code) => !NOT_BY_HTTP.includes(code as ErrorCode))
  expect([...listed].sort()).toEqual(answerable.sort())
})

test('every operation has its id, a summary and a code of its own status under each error', () => {
  for (const [path, operations] of Object.entries(document.paths)) {
    for (const [method, operation] of Object.entries(operations)) {
      expect(operation.operationId, `${method} ${path}`).toMatch(/^[a-z]\w+$/)
      for (const [status, response] of Object.entries(operation.responses).filter(([one]) => one >= '400')) {
        const json = JSON.stringify(response.content?.['application/problem+json'])
        const { enum: codes } = JSON.parse(/\{"type":"string","enum":[^}]*\}/.exec(json)?.[0] ?? '{}') as {
          enum: ErrorCode[]
        }
        for (const code of codes) expect(`${ERRORS[code].status}`, `${method} ${path} ${code}`).toBe(status)
      }
    }
  }
})

test('every schema of the description is one that a validator can take', () => {
  for (const name of Object.keys(document.components.schemas)) {
    expect(() => ajv.compile({ $ref: `openapi#/components/schemas/${name}` }), name).not.toThrow()
  }
})

const CSV = { 'content-type': 'text/csv' }

test.each([
  ['post', '/v1/replays', '', 201, { body: 'time\n1\n', headers: CSV }],
  ['post', '/v1/replays', '', 400, { body: '', headers: CSV }],
  ['post', '/v1/replays', '?exponent=x', 400, { body: 'time\n1\n', headers: CSV }],
  ['post', '/v1/replays', '', 413, { body: 'x'.repeat(1_000_001), headers: CSV }],
  ['post', '/v1/replays', '', 415, { body: '{}', headers: { 'content-type': 'application/json' } }],
  ['get', '/v1/replays', '', 200, {}],
  ['get', '/v1/replays', '?limit=0', 400, {}],
  ['get', '/v1/replays/{id}', 'replay-1', 200, {}],
  ['get', '/v1/replays/{id}', 'waiting', 200, {}],
  ['get', '/v1/replays/{id}', 'none', 404, {}],
  ['delete', '/v1/replays/{id}', 'none', 404, {}],
  ['get', '/health/live', '', 200, {}],
  ['get', '/health/ready', '', 200, {}],
] as const)('%s %s%s answers %i as described', async (method, path, end, status, init) => {
  server.replays.add({ id: 'waiting', state: 'queued' })
  const response = await fetch(`${server.url}${path.replace('{id}', '')}${end}`, {
    method: method.toUpperCase(),
    ...init,
  })
  const body: unknown = await response.json()
  expect(response.status).toBe(status)
  const type = response.headers.get('content-type')?.split(';', 1)[0] ?? ''
  const pointer = ['paths', path, method, 'responses', `${status}`, 'content', type, 'schema']
    .map((part) => encodeURIComponent(part.replaceAll('~', '~0').replaceAll('/', '~1')))
    .join('/')
  const validate = ajv.compile({ $ref: `openapi#/${pointer}` })
  validate(body)
  expect(validate.errors).toBeNull()
})

test('the description that the service gives is the committed one', async () => {
  const served: unknown = await (await fetch(`${server.url}/openapi.json`)).json()
  expect(served).toEqual(document)
})
