import { createHash } from 'node:crypto';
import type { ChunkChain } from './authenticate';
import { S3Error } from './errors';
import { chunkStringToSign, sameSignature, sha256Hex, sign, trailerStringToSign } from './sigv4';

// `aws-chunked` bodies: "Signature calculations for the Authorization header: transferring payload in multiple
// chunks" and "… for trailing headers", Amazon S3 API reference.

const LINE_MAX = 8192;
const TRAILERS_MAX = 16;

const incomplete = () =>
  new S3Error(
    'IncompleteBody',
    'The request body terminated unexpectedly or is not a well-formed chunked body.',
  );

/** Reads lines and runs of bytes from pieces of any size, holding one piece at a time. */
class ByteReader {
  private piece: Buffer = Buffer.alloc(0);
  constructor(private readonly source: AsyncIterator<Buffer>) {}

  private async more(): Promise<boolean> {
    const next = await this.source.next();
    if (next.done) return false;
    this.piece = this.piece.length === 0 ? next.value : Buffer.concat([this.piece, next.value]);
    return true;
  }

  /** A line without its CRLF. */
  async line(): Promise<string> {
    for (;;) {
      const end = this.piece.indexOf('\r\n');
      if (end >= 0) {
        const line = this.piece.toString('latin1', 0, end);
        this.piece = this.piece.subarray(end + 2);
        return line;
      }
      if (this.piece.length > LINE_MAX || !(await this.more())) throw incomplete();
    }
  }

  /** Up to `most` bytes, at least one. */
  async some(most: number): Promise<Buffer> {
    while (this.piece.length === 0) if (!(await this.more())) throw incomplete();
    const taken = this.piece.subarray(0, most);
    this.piece = this.piece.subarray(taken.length);
    return taken;
  }

  async atEnd(): Promise<boolean> {
    while (this.piece.length === 0) if (!(await this.more())) return true;
    return false;
  }
}

export interface ChunkedOptions {
  /** Without it chunks carry no signature. */
  chain?: ChunkChain | undefined;
  trailer: boolean;
  /** `x-amz-decoded-content-length` */
  decodedBytes: number;
}

/**
 * Take an `aws-chunked` body apart, verifying each chunk's signature once its last byte has passed: what was yielded
 * must be thrown away when the generator throws.
 *
 * @returns the trailing headers, lower-case names
 */
export async function* decodeChunked(
  source: AsyncIterator<Buffer>,
  options: ChunkedOptions,
): AsyncGenerator<Buffer, Map<string, string>> {
  const reader = new ByteReader(source);
  let previous = options.chain?.seedSignature ?? '';
  let decoded = 0;
  for (;;) {
    const { bytes, signature } = parseChunkHeader(await reader.line());
    decoded += bytes;
    if (decoded > options.decodedBytes) throw incomplete();
    const hash = createHash('sha256');
    for (let left = bytes; left > 0; ) {
      const piece = await reader.some(left);
      left -= piece.length;
      if (options.chain) hash.update(piece);
      yield piece;
    }
    if (options.chain) {
      const { key, amzDate, scope } = options.chain;
      previous = verified(key, chunkStringToSign(amzDate, scope, previous, hash.digest('hex')), signature);
    }
    if (bytes === 0) break;
    if ((await reader.line()) !== '') throw incomplete();
  }
  if (decoded !== options.decodedBytes) throw incomplete();
  const trailers = await readTrailers(reader, options, previous);
  if (!(await reader.atEnd())) throw incomplete();
  return trailers;
}

function parseChunkHeader(line: string): { bytes: number; signature: string } {
  const match = /^([0-9a-fA-F]{1,12})(?:;chunk-signature=([0-9a-f]{64}))?$/.exec(line);
  if (match === null) throw incomplete();
  return { bytes: Number.parseInt(match[1] as string, 16), signature: match[2] ?? '' };
}

function verified(key: Buffer, text: string, given: string): string {
  const expected = sign(key, text);
  if (!sameSignature(expected, given)) {
    throw new S3Error(
      'SignatureDoesNotMatch',
      'The signature of a chunk or of the trailing headers does not match.',
      {
        StringToSign: text,
      },
    );
  }
  return expected;
}

async function readTrailers(
  reader: ByteReader,
  options: ChunkedOptions,
  previous: string,
): Promise<Map<string, string>> {
  const trailers = new Map<string, string>();
  let signature = '';
  for (;;) {
    const line = await reader.line();
    if (line === '') {
      // Some signers put an empty line between the last chunk and the trailers.
      if (options.trailer && trailers.size === 0 && !(await reader.atEnd())) continue;
      break;
    }
    const at = line.indexOf(':');
    if (!options.trailer || at <= 0 || trailers.size >= TRAILERS_MAX) {
      throw new S3Error(
        'MalformedTrailerError',
        'The request contained trailing data that was not well-formed.',
      );
    }
    const [name, value] = [line.slice(0, at).trim().toLowerCase(), line.slice(at + 1).trim()];
    if (name === 'x-amz-trailer-signature') signature = value;
    else trailers.set(name, value);
  }
  if (options.chain && options.trailer) {
    const { key, amzDate, scope } = options.chain;
    const signed = [...trailers].map(([name, value]) => `${name}:${value}\n`).join('');
    verified(key, trailerStringToSign(amzDate, scope, previous, sha256Hex(signed)), signature);
  }
  return trailers;
}
