/** Short calls with a JSON document. */
export function jsonCalls(url: () => string) {
  const send = (method: string, path: string, body: unknown, headers: Record<string, string> = {}) =>
    fetch(`${url()}${path}`, {
      method,
      body: typeof body === 'string' ? body : JSON.stringify(body),
      headers: { 'content-type': 'application/json', ...headers },
    })
  return {
    put: (path: string, body: unknown) => send('PUT', path, body),
    post: (path: string, body: unknown, headers?: Record<string, string>) =>
      send('POST', path, body, headers),
    get: (path: string, headers: Record<string, string> = {}) => fetch(`${url()}${path}`, { headers }),
    remove: (path: string) => fetch(`${url()}${path}`, { method: 'DELETE' }),
  }
}

export async function codeOf(response: Response): Promise<string> {
  return `${response.status} ${((await response.json()) as { code: string }).code}`
}
