import { createHash } from 'node:crypto'

/** Strong entity tag of bytes, with its quotes. */
export function entityTag(bytes: Uint8Array): string {
  return `"${createHash('sha256').update(bytes).digest('hex').slice(0, 32)}"`
}

/**
 * Whether an If-None-Match header names the tag, by the weak comparison that RFC 9110 asks for.
 *
 * @param header  undefined when the request has none.
 */
export function matchesTag(header: string | undefined, tag: string): boolean {
  if (header === undefined) return false
  const named = header.split(',').map((one) => one.trim().replace(/^W\//, ''))
  return named.includes('*') || named.includes(tag)
}
