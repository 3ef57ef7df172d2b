export { checkShape, type ShapeOptions } from './check-shape.ts'
export { checkSite } from './check-site.ts'
export { createSetup, type Setup } from './create-setup.ts'
export { parseSite } from './parse-site.ts'
