import type { ChecksumName } from '../checksums';
import type { BlobWriter } from '../disk';
import { S3Error } from '../errors';
import type { BucketExchange, Exchange } from '../exchange';
import { type Received, receivePayload } from '../payload';

const payloadOptions = (exchange: Exchange) => ({
  message: exchange.message,
  request: exchange.request,
  binding: exchange.binding,
  sendContinue: exchange.sendContinue,
  ignoreSignedChecksum: exchange.behaviour.ignoreSignedChecksum,
  refuseStreamedTrailers: exchange.behaviour.refuseStreamedTrailers,
});

/**
 * Take a body to disk, verify it, and let `keep` give it an owner. Whatever goes wrong before `keep` has returned,
 * nothing of it stays.
 */
export async function receiveBlob<T>(
  exchange: BucketExchange,
  keep: (blob: string, received: Received) => Promise<T>,
  besides: readonly ChecksumName[] = [],
): Promise<T> {
  const blob = await exchange.store.newBlob();
  try {
    const take = writerOf(exchange, blob);
    const received = await receivePayload(payloadOptions(exchange), take, besides);
    await blob.finish();
    return await keep(blob.name, received);
  } catch (error) {
    await blob.discard();
    throw error;
  }
}

/** Writes pieces, until a disk that the test has filled is full. */
export function writerOf(exchange: Exchange, blob: BlobWriter): (piece: Buffer) => Promise<void> {
  const full = exchange.faults.get('full-disk');
  let written = 0;
  return async (piece) => {
    written += piece.length;
    if (full !== undefined && written > (full.atByte ?? 0)) {
      throw new S3Error('InternalError', 'We encountered an internal error. Please try again.');
    }
    await blob.write(piece);
  };
}

const DOCUMENT_BYTES_MAX = 2 * 1024 * 1024;

/** A small body, such as the XML of a request, verified like any other. */
export async function receiveDocument(exchange: Exchange): Promise<{ text: string; received: Received }> {
  const pieces: Buffer[] = [];
  let bytes = 0;
  const received = await receivePayload(payloadOptions(exchange), async (piece) => {
    bytes += piece.length;
    if (bytes > DOCUMENT_BYTES_MAX) throw new S3Error('MalformedXML', 'The XML you provided is too long');
    pieces.push(piece);
  });
  return { text: Buffer.concat(pieces).toString('utf8'), received };
}

/** As `receiveDocument`, where a request may also come without a body. */
export async function receiveOptionalDocument(exchange: Exchange): Promise<string> {
  const { request } = exchange;
  if ((request.header('content-length') ?? '0') === '0' && request.header('transfer-encoding') === undefined)
    return '';
  return (await receiveDocument(exchange)).text;
}
