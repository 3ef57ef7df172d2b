export { openapiYaml } from './openapi.ts'
export { buildServer, type ServerParts } from './server.ts'
