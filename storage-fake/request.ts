import type { IncomingMessage } from 'node:http';
import { S3Error } from './errors';
import type { WireRequest } from './sigv4';
import { percentDecode, splitQuery, textOf } from './wire';

const KEY_BYTES_MAX = 1024;

/** Query parameters of a presigned address that are about the signature, not hoisted headers. */
const SIGNATURE_PARAMETERS = new Set([
  'x-amz-algorithm',
  'x-amz-credential',
  'x-amz-date',
  'x-amz-expires',
  'x-amz-signedheaders',
  'x-amz-signature',
  'x-amz-security-token',
  'x-amz-content-sha256',
]);

/** A request, taken apart: which bucket, which key, which parameters. Nothing in it is believed yet. */
export class S3Request implements WireRequest {
  readonly method: string;
  readonly rawPath: string;
  readonly rawQuery: string;
  readonly headers: readonly (readonly [string, string])[];
  readonly bucket: string | undefined;
  readonly key: string | undefined;
  /** Name and value of each parameter; where one is repeated the first counts. */
  readonly query: ReadonlyMap<string, string>;
  /** True where the bucket stood in the Host header. */
  readonly virtualHost: boolean;
  private readonly hoisted = new Map<string, string>();

  /** @param domains hosts below which a bucket's name may stand in the Host header */
  constructor(message: IncomingMessage, domains: readonly string[]) {
    this.method = message.method ?? 'GET';
    const target = (message.url ?? '/').replace(/^https?:\/\/[^/]*/i, '');
    const at = target.indexOf('?');
    this.rawPath = (at < 0 ? target : target.slice(0, at)) || '/';
    this.rawQuery = at < 0 ? '' : target.slice(at + 1);
    const headers: [string, string][] = [];
    for (let i = 0; i + 1 < message.rawHeaders.length; i += 2) {
      headers.push([(message.rawHeaders[i] as string).toLowerCase(), message.rawHeaders[i + 1] as string]);
    }
    this.headers = headers;
    const host = bucketOfHost(message.headers.host ?? '', domains);
    this.virtualHost = host !== undefined;
    const path = this.rawPath.replace(/^\//, '');
    const slash = path.indexOf('/');
    const [first, rest] = slash < 0 ? [path, ''] : [path.slice(0, slash), path.slice(slash + 1)];
    this.bucket = host ?? (first === '' ? undefined : textOf(percentDecode(first)));
    this.key = keyOf(host === undefined ? rest : path);
    this.query = this.readQuery();
  }

  private readQuery(): Map<string, string> {
    const query = new Map<string, string>();
    for (const parameter of splitQuery(this.rawQuery)) {
      const name = textOf(parameter.name);
      if (!query.has(name)) query.set(name, textOf(parameter.value));
    }
    if (!query.has('X-Amz-Signature')) return query;
    for (const [name, value] of query) {
      const lower = name.toLowerCase();
      if (lower.startsWith('x-amz-') && !SIGNATURE_PARAMETERS.has(lower)) this.hoisted.set(lower, value);
    }
    return query;
  }

  /** A header by its lower-case name, or the parameter that a presigned address carries in its place. */
  header(name: string): string | undefined {
    const values = this.headers.filter(([other]) => other === name).map(([, value]) => value.trim());
    return values.length > 0 ? values.join(', ') : this.hoisted.get(name);
  }

  /** Every header and hoisted parameter that begins with `prefix`, without it. */
  headersWith(prefix: string): Map<string, string> {
    const names = [...this.headers.map(([name]) => name), ...this.hoisted.keys()];
    const found = new Map<string, string>();
    for (const name of names) {
      if (name.startsWith(prefix)) found.set(name.slice(prefix.length), this.header(name) ?? '');
    }
    return found;
  }

  has(parameter: string): boolean {
    return this.query.has(parameter);
  }
}

function bucketOfHost(host: string, domains: readonly string[]): string | undefined {
  const name = host.toLowerCase().replace(/:\d+$/, '');
  const domain = domains.find((one) => name.endsWith(`.${one}`));
  return domain === undefined ? undefined : name.slice(0, -domain.length - 1);
}

function keyOf(raw: string): string | undefined {
  if (raw === '') return undefined;
  const bytes = percentDecode(raw);
  if (bytes.length > KEY_BYTES_MAX) {
    throw new S3Error('KeyTooLongError', 'Your key is too long', {
      Size: String(bytes.length),
      MaxSizeAllowed: String(KEY_BYTES_MAX),
    });
  }
  return textOf(bytes);
}
