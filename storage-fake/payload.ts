import { createHash } from 'node:crypto';
import type { IncomingMessage } from 'node:http';
import type { PayloadBinding } from './authenticate';
import {
  type ChecksumName,
  type Checksums,
  checkChecksum,
  checkShape,
  checksumHeader,
  Digests,
  declaredChecksum,
} from './checksums';
import { decodeChunked } from './chunked';
import { notImplemented, S3Error } from './errors';
import type { S3Request } from './request';

const SINGLE_PUT_MAX = 5 * 1024 ** 3;

/** What became of a body once its last byte was verified. */
export interface Received {
  size: number;
  md5: Buffer;
  /** The declared checksum and those that were asked for besides, in base64. */
  checksums: Checksums;
  /** The algorithm the sender declared. */
  declared: ChecksumName | undefined;
}

export interface PayloadOptions {
  message: IncomingMessage;
  request: S3Request;
  binding: PayloadBinding;
  /** Tell a client that waits for it to send the body (RFC 9110, 10.1.1). */
  sendContinue: () => void;
  /** A store that carries a signed checksum without ever looking at the bytes. */
  ignoreSignedChecksum: boolean;
  refuseStreamedTrailers: boolean;
}

/**
 * Length of the body once decoded.
 *
 * @throws S3Error MissingContentLength, EntityTooLarge
 */
function declaredBytes({ request, binding }: PayloadOptions): number {
  const name = binding.kind === 'chunked' ? 'x-amz-decoded-content-length' : 'content-length';
  const text = request.header(name);
  if (text === undefined || !/^\d{1,15}$/.test(text)) {
    throw new S3Error('MissingContentLength', 'You must provide the Content-Length HTTP header.');
  }
  const bytes = Number(text);
  if (bytes > SINGLE_PUT_MAX) {
    throw new S3Error('EntityTooLarge', 'Your proposed upload exceeds the maximum allowed size', {
      MaxSizeAllowed: String(SINGLE_PUT_MAX),
      ProposedSize: text,
    });
  }
  return bytes;
}

function contentMd5(request: S3Request): Buffer | undefined {
  const text = request.header('content-md5');
  if (text === undefined) return undefined;
  const bytes = Buffer.from(text, 'base64');
  if (bytes.length !== 16) throw new S3Error('InvalidDigest', 'The Content-MD5 you specified is not valid.');
  return bytes;
}

/** Pieces of the body as they arrive; the socket stays open when the reader stops early. */
const piecesOf = (message: IncomingMessage): AsyncIterator<Buffer> =>
  message.iterator({ destroyOnReturn: false })[Symbol.asyncIterator]() as AsyncIterator<Buffer>;

/**
 * Read a body, hand each piece to `take`, and verify all that the request says about it: length, payload hash or
 * chunk signatures, Content-MD5, checksum. Until this returns, what `take` was given is worth nothing.
 *
 * @param besides further checksums to compute
 */
export async function receivePayload(
  options: PayloadOptions,
  take: (piece: Buffer) => Promise<void>,
  besides: readonly ChecksumName[] = [],
): Promise<Received> {
  const { request, binding } = options;
  if (
    options.refuseStreamedTrailers &&
    (request.header('x-amz-trailer') !== undefined || (binding.kind === 'chunked' && binding.trailer))
  ) {
    throw notImplemented();
  }
  const expectedBytes = declaredBytes(options);
  const md5 = contentMd5(request);
  const declared = declaredChecksum(request);
  const digests = new Digests([...(declared ? [declared.name] : []), ...besides]);
  const payloadHash = createHash('sha256');
  options.sendContinue();
  let size = 0;
  let trailers = new Map<string, string>();
  const pieces = piecesOf(options.message);
  const decoded =
    binding.kind === 'chunked' ? decodeChunked(pieces, { ...binding, decodedBytes: expectedBytes }) : pieces;
  for (;;) {
    const next = await decoded.next();
    if (next.done) {
      if (next.value instanceof Map) trailers = next.value;
      break;
    }
    size += next.value.length;
    digests.update(next.value);
    if (binding.kind === 'sha256') payloadHash.update(next.value);
    await take(next.value);
  }
  if (size !== expectedBytes) {
    throw new S3Error(
      'IncompleteBody',
      'You did not provide the number of bytes specified by the Content-Length HTTP header',
    );
  }
  if (binding.kind === 'sha256' && payloadHash.digest('hex') !== binding.hex) {
    throw new S3Error(
      'XAmzContentSHA256Mismatch',
      "The provided 'x-amz-content-sha256' header does not match what was computed.",
    );
  }
  const result = digests.finish();
  if (md5 !== undefined && !md5.equals(result.md5)) {
    throw new S3Error('BadDigest', 'The Content-MD5 you specified did not match what we received.');
  }
  const checksums = verifyDeclared(options, trailers, result.checksums);
  return { size, md5: result.md5, checksums, declared: declared?.name };
}

function verifyDeclared(
  options: PayloadOptions,
  trailers: Map<string, string>,
  computed: Checksums,
): Checksums {
  const declared = declaredChecksum(options.request);
  if (declared === undefined) return computed;
  const { name } = declared;
  const value = declared.value ?? trailers.get(checksumHeader(name));
  if (value === undefined) {
    throw new S3Error(
      'MalformedTrailerError',
      `The trailing header ${checksumHeader(name)} was announced and did not come.`,
    );
  }
  if (options.ignoreSignedChecksum && declared.value !== undefined) return { ...computed, [name]: value };
  checkShape(name, value);
  checkChecksum(name, value, computed[name]);
  return computed;
}
