import { answerEmpty, answerFile } from '../answer';
import { checkReadConditions } from '../conditions';
import { headersOf, httpDate, quoted } from '../describe';
import { S3Error } from '../errors';
import type { KeyExchange } from '../exchange';
import type { ObjectRecord } from '../objects';
import { type ByteRange, parseRange } from '../range';

const OVERRIDES = [
  'content-type',
  'content-language',
  'expires',
  'cache-control',
  'content-disposition',
  'content-encoding',
];

/** GetObject and HeadObject. */
export async function getObject(exchange: KeyExchange): Promise<void> {
  const { request, bucket, key, store } = exchange;
  const { record, file } = await store.openObject(bucket, key);
  let handed = false;
  try {
    const get = (name: string) => request.header(name);
    const outcome = checkReadConditions(get, record);
    if (outcome === 'unchanged') {
      const { etag, 'last-modified': lastModified } = headersOf(record, false);
      return await answerEmpty(exchange, 304, { etag, 'last-modified': lastModified });
    }
    const part = partOf(request.query.get('partNumber'), record);
    const range =
      part?.range ??
      (rangeApplies(get('if-range'), record) ? parseRange(get('range'), record.sizeBytes) : undefined);
    const sent = range ?? { start: 0, length: record.sizeBytes };
    // A checksum over the whole says nothing about a part of it, and clients would compare.
    const withChecksums = get('x-amz-checksum-mode')?.toUpperCase() === 'ENABLED' && range === undefined;
    const described = {
      ...headersOf(record, withChecksums),
      ...overridesOf(exchange),
      'x-amz-mp-parts-count': part?.count,
      'content-range': range && `bytes ${range.start}-${range.start + range.length - 1}/${record.sizeBytes}`,
    };
    const status = range === undefined ? 200 : 206;
    if (request.method === 'HEAD')
      return await answerEmpty(exchange, status, { ...described, 'content-length': sent.length });
    handed = true;
    await answerFile(exchange, status, described, file, sent);
  } finally {
    if (!handed) await file.close();
  }
}

function overridesOf(exchange: KeyExchange): Record<string, string> {
  const found: Record<string, string> = {};
  for (const name of OVERRIDES) {
    const value = exchange.request.query.get(`response-${name}`);
    if (value === undefined) continue;
    if (/[^\u0020-\u007e\u00a0-\u00ff]/.test(value)) {
      throw new S3Error('InvalidArgument', 'Header value cannot be represented using ISO-8859-1.');
    }
    found[name] = value;
  }
  return found;
}

/** RFC 9110, 13.1.5: a range counts only while the object is the one the client has a part of. */
function rangeApplies(ifRange: string | undefined, record: ObjectRecord): boolean {
  return ifRange === undefined || ifRange === quoted(record.etag) || ifRange === httpDate(record.modifiedMs);
}

function partOf(
  text: string | undefined,
  record: ObjectRecord,
): { range: ByteRange | undefined; count: number | undefined } | undefined {
  if (text === undefined) return undefined;
  const sizes = record.partSizes ?? [record.sizeBytes];
  const number = Number(text);
  const length = sizes[number - 1];
  if (!Number.isInteger(number) || length === undefined) {
    throw new S3Error('InvalidRange', 'The requested partnumber is not satisfiable');
  }
  const start = sizes.slice(0, number - 1).reduce((sum, size) => sum + size, 0);
  return { range: length === 0 ? undefined : { start, length }, count: record.partSizes?.length };
}
