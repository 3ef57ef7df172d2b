export { checkShape, type ShapeOptions } from './check-shape.ts'
export { parseSite } from './parse-site.ts'
