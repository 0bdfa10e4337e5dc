import { createHash } from 'node:crypto';
import { crc32, crc32c, crc64nvme, type Running } from './crc';
import { S3Error } from './errors';
import type { S3Request } from './request';

/** Checksum algorithms of S3 ("Checking object integrity", Amazon S3 user guide) and the bytes in each. */
const BYTES = { crc32: 4, crc32c: 4, crc64nvme: 8, sha1: 20, sha256: 32 } as const;

export type ChecksumName = keyof typeof BYTES;
export const CHECKSUM_NAMES = Object.keys(BYTES) as ChecksumName[];

/** Base64 of each checksum that an object carries. */
export type Checksums = Partial<Record<ChecksumName, string>>;

/** Element in an XML document, such as `ChecksumSHA256`. */
export const checksumElement = (name: ChecksumName): string => `Checksum${name.toUpperCase()}`;
export const checksumHeader = (name: ChecksumName): string => `x-amz-checksum-${name}`;

export const isChecksumName = (text: string): text is ChecksumName => Object.hasOwn(BYTES, text);

function running(name: ChecksumName): Running {
  if (name === 'crc32') return crc32();
  if (name === 'crc32c') return crc32c();
  if (name === 'crc64nvme') return crc64nvme();
  const hash = createHash(name);
  return { update: (data) => void hash.update(data), digest: () => hash.digest() };
}

/** Several checksums over the same bytes. */
export class Digests {
  private readonly md5 = createHash('md5');
  private readonly others: Map<ChecksumName, Running>;
  constructor(names: Iterable<ChecksumName>) {
    this.others = new Map([...names].map((name) => [name, running(name)]));
  }
  update(data: Uint8Array): void {
    this.md5.update(data);
    for (const other of this.others.values()) other.update(data);
  }
  finish(): { md5: Buffer; checksums: Checksums } {
    const checksums: Checksums = {};
    for (const [name, other] of this.others) checksums[name] = other.digest().toString('base64');
    return { md5: this.md5.digest(), checksums };
  }
}

/** What the sender says about the bytes: a value in a header, or the name of a trailer that will bring it. */
export interface DeclaredChecksum {
  name: ChecksumName;
  /** Base64; undefined until the trailer has come. */
  value: string | undefined;
}

/**
 * The one checksum a request declares.
 *
 * @throws S3Error InvalidRequest where there are two, one is not of its length, or one is announced and missing
 */
export function declaredChecksum(request: S3Request): DeclaredChecksum | undefined {
  const declared: DeclaredChecksum[] = [];
  for (const name of CHECKSUM_NAMES) {
    const value = request.header(checksumHeader(name));
    if (value !== undefined) declared.push({ name, value });
  }
  const trailer = (request.header('x-amz-trailer') ?? '').trim().toLowerCase();
  const trailing = trailer.replace(/^x-amz-checksum-/, '');
  if (trailer !== '' && isChecksumName(trailing)) declared.push({ name: trailing, value: undefined });
  if (declared.length > 1) {
    throw new S3Error(
      'InvalidRequest',
      'Expecting a single x-amz-checksum- header. Multiple checksum Types are not allowed.',
    );
  }
  const [only] = declared;
  if (only === undefined && request.header('x-amz-sdk-checksum-algorithm') !== undefined) {
    throw new S3Error(
      'InvalidRequest',
      'x-amz-sdk-checksum-algorithm specified, but no corresponding x-amz-checksum-* or x-amz-trailer headers were found.',
    );
  }
  if (only?.value !== undefined) checkShape(only.name, only.value);
  return only;
}

/** @throws S3Error InvalidRequest unless the value is base64 of as many bytes as the algorithm has */
export function checkShape(name: ChecksumName, value: string): void {
  const bytes = Buffer.from(value, 'base64');
  if (bytes.length !== BYTES[name] || bytes.toString('base64') !== value) {
    throw new S3Error('InvalidRequest', `Value for ${checksumHeader(name)} header is invalid.`);
  }
}

/** @throws S3Error BadDigest where the bytes are not the ones that were declared */
export function checkChecksum(name: ChecksumName, declared: string, computed: string | undefined): void {
  if (declared === computed) return;
  throw new S3Error(
    'BadDigest',
    `The ${name.toUpperCase()} you specified did not match the calculated checksum.`,
  );
}
