/** Ids become file names: what is longer or holds anything else than these characters is the id of nothing. */
export function isId(text: string): boolean {
  return /^[A-Za-z0-9_-]{1,100}$/.test(text)
}

/** @throws Error when a part of this program made an id that cannot be a file name. */
export function checkId(text: string): string {
  if (!isId(text)) throw new Error(`id: expected 1 to 100 of A-Z a-z 0-9 _ -, got ${JSON.stringify(text)}`)
  return text
}
