/** An answer that sets these cookies. */
export function withCookies(response: Response, lines: readonly string[]): Response {
  for (const line of lines) response.headers.append('set-cookie', line);
  return response;
}
