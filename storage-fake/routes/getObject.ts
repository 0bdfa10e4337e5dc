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
    const headers = {
      ...headersOf(record, get('x-amz-checksum-mode')?.toUpperCase() === 'ENABLED'),
      ...overridesOf(exchange),
    };
    if (outcome === 'unchanged') {
      const { etag, 'last-modified': lastModified } = headers;
      return await answerEmpty(exchange, 304, { etag, 'last-modified': lastModified });
    }
    const part = partOf(request.query.get('partNumber'), record);
    const range =
      part?.range ??
      (rangeApplies(get('if-range'), record) ? parseRange(get('range'), record.sizeBytes) : undefined);
    const partial = range !== undefined && (part !== undefined || get('range') !== undefined);
    const sent = range ?? { start: 0, length: record.sizeBytes };
    const described = {
      ...headers,
      'x-amz-mp-parts-count': part?.count,
      'content-range': partial
        ? `bytes ${sent.start}-${sent.start + sent.length - 1}/${record.sizeBytes}`
        : undefined,
    };
    const status = partial ? 206 : 200;
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
