import { randomBytes } from 'node:crypto';
import type { FileHandle } from 'node:fs/promises';
import type { ServerResponse } from 'node:http';
import type { Exchange } from './exchange';
import { toXml, type XmlValue } from './xml';

type Headers = Record<string, string | number | undefined>;

/** Headers of every answer. */
export function commonHeaders(response: ServerResponse, requestId: string): void {
  response.setHeader('server', 'storage-fake');
  response.setHeader('x-amz-request-id', requestId);
  response.setHeader('x-amz-id-2', Buffer.from(requestId).toString('base64'));
}

export const newRequestId = (): string => randomBytes(8).toString('hex').toUpperCase();

function setHeaders(response: ServerResponse, headers: Headers): void {
  for (const [name, value] of Object.entries(headers))
    if (value !== undefined) response.setHeader(name, value);
}

/** True where the answer is to be lost on its way: the work was done and the client never hears of it. */
function lost(exchange: Exchange): boolean {
  if (exchange.faults.get('answer-lost') === undefined) return false;
  exchange.response.destroy();
  return true;
}

export async function answerEmpty(exchange: Exchange, status: number, headers: Headers = {}): Promise<void> {
  if (lost(exchange)) return;
  setHeaders(exchange.response, headers);
  if (status !== 204 && status !== 304 && !exchange.response.hasHeader('content-length')) {
    exchange.response.setHeader('content-length', 0);
  }
  exchange.response.writeHead(status).end();
}

export async function answerXml(
  exchange: Exchange,
  root: string,
  value: XmlValue,
  headers: Headers = {},
): Promise<void> {
  if (lost(exchange)) return;
  const body = Buffer.from(toXml(root, value));
  setHeaders(exchange.response, {
    'content-type': 'application/xml',
    'content-length': body.length,
    ...headers,
  });
  exchange.response.writeHead(200).end(exchange.request.method === 'HEAD' ? undefined : body);
}

const PIECE = 256 * 1024;

/** Until the response takes more, or will never. */
function drained(response: ServerResponse): Promise<void> {
  return new Promise((resolve) => {
    const done = (): void => {
      response.off('drain', done).off('close', done);
      resolve();
    };
    response.on('drain', done).on('close', done);
  });
}

/**
 * Send `length` bytes of a file from `start` on. A failure under way cuts the connection, so that no client takes
 * half of the bytes for all of them.
 */
export async function answerFile(
  exchange: Exchange,
  status: number,
  headers: Headers,
  file: FileHandle,
  range: { start: number; length: number },
): Promise<void> {
  const { response, faults } = exchange;
  try {
    if (lost(exchange)) return;
    setHeaders(response, { ...headers, 'content-length': range.length });
    response.writeHead(status);
    const cutAt =
      faults.get('cut-body')?.atByte ?? (faults.get('cut-body') ? Math.floor(range.length / 2) : undefined);
    const wrongAt = faults.get('wrong-bytes') ? (faults.get('wrong-bytes')?.atByte ?? 0) : undefined;
    const end = Math.min(range.length, cutAt ?? range.length);
    for (let sent = 0; sent < end; ) {
      const piece = Buffer.allocUnsafe(Math.min(PIECE, end - sent));
      const { bytesRead } = await file.read(piece, 0, piece.length, range.start + sent);
      if (bytesRead === 0 || response.destroyed) return void response.destroy();
      const bytes = piece.subarray(0, bytesRead);
      if (wrongAt !== undefined && wrongAt >= sent && wrongAt < sent + bytesRead) {
        bytes[wrongAt - sent] = (bytes[wrongAt - sent] as number) ^ 0x01;
      }
      sent += bytesRead;
      if (!response.write(bytes)) await drained(response);
    }
    if (end < range.length) response.socket?.destroySoon();
    else response.end();
  } finally {
    await file.close();
  }
}

/** @param extra further elements of the error document */
export function errorDocument(
  code: string,
  message: string,
  resource: string,
  requestId: string,
  extra: Readonly<Record<string, string>>,
): Buffer {
  const body = {
    Code: code,
    Message: message,
    ...extra,
    Resource: resource,
    RequestId: requestId,
    HostId: 'storage-fake',
  };
  return Buffer.from(toXml('Error', body, false));
}
