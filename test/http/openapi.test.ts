import { readFileSync } from 'node:fs'
import { Ajv2020 } from 'ajv/dist/2020.js'
import addFormatsModule from 'ajv-formats'
import { afterAll, beforeAll, expect, test } from 'vitest'
import { parse } from 'yaml'
import { ERRORS, type ErrorCode } from '../../src/errors.ts'
import { openapiYaml } from '../../src/http/index.ts'
import { sheetExample } from './sheet-example.ts'
import { startServerOnStore, type ServerOnStore } from './started-server.ts'

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

let server: ServerOnStore
beforeAll(async () => {
  server = await startServerOnStore({ inMemory: true })
})
afterAll(async () => {
  await server.stop()
})

/** Codes that only the command line meets. */
const NOT_BY_HTTP: readonly ErrorCode[] = ['BAD_CONFIG', 'LOG_NOT_FOUND']

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

const JSON_TYPE = { 'content-type': 'application/json' }
const LOG = [
  'time,turbine,wind_speed,vane,power',
  '2026-03-01T00:00:00Z,Q01,8,1,900',
  '2026-03-01T00:10:00Z,Q01,8,1,900',
  'never,Q01,8,1,900',
].join('\n')
const WINDOW = '{"site":"quern-hill","from":"2026-03-01T00:00:00Z","to":"2026-04-01T00:00:00Z"}'

beforeAll(async () => {
  const { url } = server
  await fetch(`${url}/v1/sites/quern-hill`, {
    method: 'PUT',
    body: '{"turbines":[{"turbine":"Q01"}]}',
    headers: JSON_TYPE,
  })
  await fetch(`${url}/v1/sites/quern-hill/logs`, { method: 'POST', body: LOG, headers: CSV })
  server.replays.add({ id: 'waiting', state: 'queued' })
  const sheet = JSON.stringify(sheetExample('latest'))
  server.replays.add({ id: 'latest', site: 'quern-hill', state: 'done', finishedMs: 1, sheet })
})

/** [method, path of the description, values of its parameters and the query, status, rest of the request] */
const CALLS: [string, string, string, number, RequestInit?][] = [
  ['post', '/v1/replays', '', 201, { body: LOG, headers: CSV }],
  ['post', '/v1/replays', '', 201, { body: WINDOW, headers: JSON_TYPE }],
  ['post', '/v1/replays', '', 202, { body: WINDOW, headers: { ...JSON_TYPE, prefer: 'respond-async' } }],
  ['post', '/v1/replays', '?dryRun=true', 200, { body: LOG, headers: CSV }],
  ['post', '/v1/replays', '', 400, { body: '', headers: CSV }],
  ['post', '/v1/replays', '?exponent=x', 400, { body: 'time\n1\n', headers: CSV }],
  ['post', '/v1/replays', '', 400, { body: '{}', headers: JSON_TYPE }],
  ['post', '/v1/replays', '', 413, { body: new Uint8Array(50_000_001), headers: CSV }],
  ['post', '/v1/replays', '', 415, { body: 'x', headers: { 'content-type': 'image/png' } }],
  ['get', '/v1/replays', '', 200],
  ['get', '/v1/replays', '?limit=0', 400],
  ['get', '/v1/replays/{id}', 'latest', 200],
  ['get', '/v1/replays/{id}', 'waiting', 200],
  ['get', '/v1/replays/{id}', 'none', 404],
  ['get', '/v1/replays/{id}/rows', 'none', 404],
  ['get', '/v1/replays/{id}/rows', 'latest', 406, { headers: { accept: 'image/png' } }],
  ['delete', '/v1/replays/{id}', 'none', 404],
  ['put', '/v1/sites/{site}', 'mill-farm', 201, { body: '{}', headers: JSON_TYPE }],
  ['put', '/v1/sites/{site}', 'mill-farm', 200, { body: '{"timezone":"UTC"}', headers: JSON_TYPE }],
  ['put', '/v1/sites/{site}', 'mill-farm', 422, { body: '{"site":"other"}', headers: JSON_TYPE }],
  ['get', '/v1/sites/{site}', 'quern-hill', 200],
  ['get', '/v1/sites/{site}', 'none', 404],
  ['get', '/v1/sites', '', 200],
  ['put', '/v1/sites/{site}/turbines/{turbine}', 'quern-hill Q09', 201, { body: '{}', headers: JSON_TYPE }],
  ['get', '/v1/sites/{site}/turbines/{turbine}', 'quern-hill Q01', 200],
  ['get', '/v1/sites/{site}/turbines/{turbine}', 'quern-hill Q77', 404],
  ['post', '/v1/sites/{site}/logs', 'quern-hill', 200, { body: LOG, headers: CSV }],
  ['post', '/v1/sites/{site}/logs', 'quern-hill ?dryRun=true', 200, { body: LOG, headers: CSV }],
  ['post', '/v1/sites/{site}/logs', 'quern-hill ?stamp=end', 201, { body: LOG, headers: CSV }],
  ['post', '/v1/sites/{site}/logs', 'none', 404, { body: LOG, headers: CSV }],
  ['get', '/v1/sites/{site}/logs', 'quern-hill', 200],
  ['get', '/v1/sites/{site}/logs/{batch}', 'quern-hill none', 404],
  ['get', '/v1/sites/{site}/turbines/{turbine}/coverage', 'quern-hill Q01', 200],
  ['get', '/v1/sites/{site}/turbines/{turbine}/coverage', 'quern-hill Q01 ?from=x', 400],
  ['get', '/v1/sites/{site}/turbines/{turbine}/yaw-error', 'quern-hill Q01', 200],
  ['get', '/v1/sites/{site}/turbines/{turbine}/static-offset', 'quern-hill Q01', 200],
  ['get', '/v1/sites/{site}/turbines/{turbine}/energy-loss', 'quern-hill Q01', 200],
  ['get', '/v1/sites/{site}/turbines/{turbine}/sensors', 'quern-hill Q01', 200],
  ['get', '/v1/sites/{site}/turbines/{turbine}/yaw-activity', 'quern-hill Q01', 200],
  ['get', '/v1/sites/{site}/turbines/{turbine}/yaw-activity', 'quern-hill Q77', 404],
  ['get', '/v1/sites/{site}/worklist', 'quern-hill', 200],
  ['get', '/v1/sites/{site}/worklist', 'none', 404],
  ['get', '/v1/worklist', '', 200],
  ['get', '/health/live', '', 200],
  ['get', '/health/ready', '', 200],
  ...['corrections', 'events', 'exclude'].flatMap(
    (list): [string, string, string, number, RequestInit?][] => {
      const entry = {
        corrections: '{"turbine":"Q01","at":"2026-03-02T10:00:00Z","enteredDeg":6}',
        events: '{"at":"2026-03-02T10:00:00Z","kind":"vane replaced"}',
        exclude: '{"from":"2026-03-02T10:00:00Z","to":"2026-03-03T10:00:00Z"}',
      }[list] as string
      const path = `/v1/sites/{site}/${list}`
      return [
        ['post', path, 'quern-hill', 201, { body: entry, headers: JSON_TYPE }],
        ['post', path, 'quern-hill', 200, { body: entry, headers: JSON_TYPE }],
        ['post', path, 'quern-hill', 422, { body: '{"at":1}', headers: JSON_TYPE }],
        ['get', path, 'quern-hill', 200],
        ['delete', `${path}/{id}`, 'quern-hill none', 404],
      ]
    },
  ),
]

test.each(CALLS)(
  '%s %s with "%s" answers %i as described',
  async (method, path, given, status, init = {}) => {
    const values = given.split(' ').filter((one) => !one.startsWith('?'))
    const query = /\?.*$/.exec(given)?.[0] ?? ''
    const address = path.replaceAll(/\{\w+\}/g, () => values.shift() ?? '') + query
    const response = await fetch(`${server.url}${address}`, { method: method.toUpperCase(), ...init })
    const body: unknown = await response.json()
    expect(response.status, JSON.stringify(body)).toBe(status)
    const type = response.headers.get('content-type')?.split(';', 1)[0] ?? ''
    const pointer = ['paths', path, method, 'responses', `${status}`, 'content', type, 'schema']
      .map((part) => encodeURIComponent(part.replaceAll('~', '~0').replaceAll('/', '~1')))
      .join('/')
    const validate = ajv.compile({ $ref: `openapi#/${pointer}` })
    validate(body)
    expect(validate.errors).toBeNull()
  },
)

test('the description that the service gives is the committed one', async () => {
  const served: unknown = await (await fetch(`${server.url}/openapi.json`)).json()
  expect(served).toEqual(document)
})
