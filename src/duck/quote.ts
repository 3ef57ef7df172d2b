/** The only place where names and texts become SQL. Values are bound; what cannot be bound passes through here. */

/**
 * A name (column, table) as SQL, whatever it contains.
 * @throws Error when it holds a NUL, which no identifier can.
 */
export function quoteIdentifier(name: string): string {
  if (name.includes('\0')) throw new Error('identifier: expected no NUL character')
  return `"${name.replaceAll('"', '""')}"`
}

/**
 * A text as an SQL literal: for file names in table functions and settings, which take no bound values.
 * @throws Error when it holds a NUL.
 */
export function quoteText(text: string): string {
  if (text.includes('\0')) throw new Error('text: expected no NUL character')
  return `'${text.replaceAll("'", "''")}'`
}

/** A list of texts as an SQL list literal. */
export function quoteTexts(texts: readonly string[]): string {
  return `[${texts.map(quoteText).join(', ')}]`
}
