import { answerXml } from '../answer';
import { CHECKSUM_NAMES } from '../checksums';
import { isoDate, quoted } from '../describe';
import { S3Error } from '../errors';
import type { BucketExchange } from '../exchange';
import { type Listed, listKeys } from '../listing';
import type { ObjectRecord } from '../objects';
import { percentEncode } from '../wire';
import type { XmlValue } from '../xml';

const PAGE_MAX = 1000;
const OWNER = { ID: 'storage-fake', DisplayName: 'storage-fake' };

function limitOf(text: string | undefined, name: string): number {
  if (text === undefined || text === '') return PAGE_MAX;
  if (!/^\d{1,10}$/.test(text))
    throw new S3Error('InvalidArgument', `Argument ${name} must be an integer between 0 and 2147483647`);
  return Math.min(Number(text), PAGE_MAX);
}

/** `encoding-type=url` lets keys travel that XML has no characters for. */
export function encoderOf(exchange: BucketExchange): {
  type: string | undefined;
  encode: (text: string) => string;
} {
  const type = exchange.request.query.get('encoding-type');
  if (type === undefined) return { type, encode: (text) => text };
  if (type !== 'url') throw new S3Error('InvalidArgument', 'Invalid Encoding Method specified in Request');
  return { type, encode: (text) => percentEncode(Buffer.from(text), true) };
}

function list(
  exchange: BucketExchange,
  after: string,
): { listed: Listed<ObjectRecord>; common: Record<string, XmlValue> } {
  const { query } = exchange.request;
  const { type, encode } = encoderOf(exchange);
  const [prefix, delimiter] = [query.get('prefix') ?? '', query.get('delimiter') ?? ''];
  const limit = limitOf(query.get('max-keys'), 'max-keys');
  const listed: Listed<ObjectRecord> = exchange.faults.get('empty-listing')
    ? { entries: [], truncated: false, last: undefined }
    : listKeys(exchange.bucket.index, { prefix, delimiter, after, limit });
  return {
    listed,
    common: {
      Name: exchange.bucket.record.name,
      Prefix: encode(prefix),
      Delimiter: delimiter === '' ? undefined : encode(delimiter),
      MaxKeys: limit,
      EncodingType: type,
      IsTruncated: listed.truncated,
    },
  };
}

const contentsOf = (
  record: ObjectRecord,
  encode: (text: string) => string,
  withOwner: boolean,
): XmlValue => ({
  Key: encode(record.key),
  LastModified: isoDate(record.modifiedMs),
  ETag: quoted(record.etag),
  ChecksumAlgorithm: CHECKSUM_NAMES.filter((name) => record.checksums[name] !== undefined).map((name) =>
    name.toUpperCase(),
  ),
  ChecksumType: record.checksumType,
  Size: record.sizeBytes,
  Owner: withOwner ? OWNER : undefined,
  StorageClass: record.system['x-amz-storage-class'] ?? 'STANDARD',
});

function entriesOf(
  listed: Listed<ObjectRecord>,
  encode: (text: string) => string,
  withOwner: boolean,
): Record<string, XmlValue> {
  return {
    Contents: listed.entries.flatMap((entry) =>
      'key' in entry ? [contentsOf(entry.record, encode, withOwner)] : [],
    ),
    CommonPrefixes: listed.entries.flatMap((entry) =>
      'commonPrefix' in entry ? [{ Prefix: encode(entry.commonPrefix) }] : [],
    ),
  };
}

const tokenOf = (last: string): string => Buffer.from(last).toString('base64url');

function afterToken(token: string): string {
  const text = Buffer.from(token, 'base64url').toString('utf8');
  if (tokenOf(text) !== token)
    throw new S3Error('InvalidArgument', 'The continuation token provided is incorrect');
  return text;
}

export async function listObjectsV2(exchange: BucketExchange): Promise<void> {
  const { query } = exchange.request;
  const { encode } = encoderOf(exchange);
  const [token, startAfter] = [query.get('continuation-token'), query.get('start-after')];
  const { listed, common } = list(exchange, token === undefined ? (startAfter ?? '') : afterToken(token));
  await answerXml(exchange, 'ListBucketResult', {
    ...common,
    KeyCount: listed.entries.length,
    ContinuationToken: token,
    NextContinuationToken: listed.truncated && listed.last !== undefined ? tokenOf(listed.last) : undefined,
    StartAfter: startAfter === undefined ? undefined : encode(startAfter),
    ...entriesOf(listed, encode, query.get('fetch-owner') === 'true'),
  });
}

/** The first form of the listing, which some clients still use. */
export async function listObjectsV1(exchange: BucketExchange): Promise<void> {
  const { encode } = encoderOf(exchange);
  const marker = exchange.request.query.get('marker') ?? '';
  const { listed, common } = list(exchange, marker);
  await answerXml(exchange, 'ListBucketResult', {
    ...common,
    Marker: encode(marker),
    NextMarker:
      listed.truncated && common.Delimiter !== undefined && listed.last !== undefined
        ? encode(listed.last)
        : undefined,
    ...entriesOf(listed, encode, true),
  });
}

/** Every object has the one version that is there, whose id is `null` as in a bucket without versions. */
export async function listObjectVersions(exchange: BucketExchange): Promise<void> {
  const { encode } = encoderOf(exchange);
  const marker = exchange.request.query.get('key-marker') ?? '';
  const { listed, common } = list(exchange, marker);
  const { Contents, CommonPrefixes } = entriesOf(listed, encode, true);
  await answerXml(exchange, 'ListVersionsResult', {
    ...common,
    KeyMarker: encode(marker),
    VersionIdMarker: '',
    NextKeyMarker: listed.truncated && listed.last !== undefined ? encode(listed.last) : undefined,
    NextVersionIdMarker: listed.truncated ? 'null' : undefined,
    Version: (Contents as Record<string, XmlValue>[]).map((one) => ({
      ...one,
      VersionId: 'null',
      IsLatest: true,
    })),
    CommonPrefixes,
  });
}
