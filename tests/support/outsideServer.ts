import { createServer, type IncomingMessage, type ServerResponse } from 'node:http';
import type { AddressInfo } from 'node:net';

export interface OutsideServer {
  origin: string;
  /** What was asked for, oldest first. */
  asked: { method: string; path: string; headers: IncomingMessage['headers']; body: string }[];
  close(): Promise<void>;
}

/** Another system: a real server on loopback that answers as a test says. */
export async function outsideServer(
  answer: (request: { method: string; path: string; body: string }, response: ServerResponse) => void,
): Promise<OutsideServer> {
  const asked: OutsideServer['asked'] = [];
  const server = createServer(async (incoming, outgoing) => {
    const chunks: Buffer[] = [];
    for await (const chunk of incoming) chunks.push(chunk as Buffer);
    const request = {
      method: incoming.method ?? '',
      path: incoming.url ?? '',
      body: Buffer.concat(chunks).toString('utf8'),
    };
    asked.push({ ...request, headers: incoming.headers });
    answer(request, outgoing);
  });
  await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
  return {
    origin: `http://127.0.0.1:${(server.address() as AddressInfo).port}`,
    asked,
    async close() {
      server.closeAllConnections();
      await new Promise((resolve) => server.close(resolve));
    },
  };
}

/** An answer in JSON. */
export function sendJson(response: ServerResponse, status: number, body: unknown): void {
  response.writeHead(status, { 'content-type': 'application/json' }).end(JSON.stringify(body));
}
