import { lookup as lookUp } from 'node:dns/promises';
import { request as httpRequest, type IncomingMessage } from 'node:http';
import { request as httpsRequest } from 'node:https';
import type { LookupFunction } from 'node:net';
import ipaddr from 'ipaddr.js';
import type { Env } from './env';

/** Why an address of another system was not called, or gave nothing of use. */
export class OutsideError extends Error {
  override readonly name = 'OutsideError';
  constructor(
    readonly code: 'address' | 'not-found' | 'private' | 'redirect' | 'timeout' | 'too-large' | 'no-answer',
    message: string,
    options?: { cause?: unknown },
  ) {
    super(message, options);
  }
}

export interface Resolved {
  address: string;
  family: number;
}
/** All addresses of a host name. Given by tests; the system's resolver otherwise. */
export type Resolve = (host: string) => Promise<Resolved[]>;

const systemResolve: Resolve = (host) => lookUp(host, { all: true, verbatim: true });

type Settings = Pick<Env, 'PRIVATE_ADDRESSES_ALLOWED'>;

/** Whether the settings name this address although it is not one of the public Internet. */
function isAllowed(address: ipaddr.IPv4 | ipaddr.IPv6, settings: Settings): boolean {
  return settings.PRIVATE_ADDRESSES_ALLOWED.some((range) => {
    const [network, bits] = ipaddr.parseCIDR(range);
    return network.kind() === address.kind() && address.match(network, bits);
  });
}

/**
 * Whether an address may be called: public unicast, or one that the settings name. Loopback, link-local, private,
 * multicast, documentation and every translated or tunnelled range are not (IANA special-purpose registries, RFC 6890);
 * IPv4 in IPv6 counts as the IPv4 that it is.
 */
export function mayCall(text: string, settings: Settings): boolean {
  if (!ipaddr.isValid(text)) return false;
  const address = ipaddr.process(text);
  return address.range() === 'unicast' || isAllowed(address, settings);
}

/** @throws OutsideError `address` for what is no web address that may be used */
export function parseOutsideUrl(text: string): URL {
  if (!URL.canParse(text)) throw new OutsideError('address', 'This is no web address.');
  const url = new URL(text);
  if (url.protocol !== 'https:' && url.protocol !== 'http:')
    throw new OutsideError('address', 'The address begins with https://');
  if (url.username || url.password)
    throw new OutsideError('address', 'The address holds no name and password.');
  return url;
}

/**
 * The address that a host has now, checked. Of several all must be allowed: which of them answers is the resolver's
 * choice, not ours.
 *
 * @throws OutsideError `not-found`, `private`; `address` for plain http to anywhere but an address the settings name
 */
export async function resolveOutside(
  url: URL,
  settings: Settings,
  resolve = systemResolve,
): Promise<Resolved> {
  const host = url.hostname.replace(/^\[|\]$/g, '');
  let found: Resolved[];
  if (ipaddr.isValid(host)) found = [{ address: host, family: ipaddr.parse(host).kind() === 'ipv4' ? 4 : 6 }];
  else {
    try {
      found = await resolve(host);
    } catch (cause) {
      throw new OutsideError('not-found', `${host} has no address.`, { cause });
    }
  }
  const [first] = found;
  if (!first) throw new OutsideError('not-found', `${host} has no address.`);
  for (const { address } of found)
    if (!mayCall(address, settings))
      throw new OutsideError(
        'private',
        `${host} leads to ${address}, which is inside. Name the range in PRIVATE_ADDRESSES_ALLOWED if that is meant.`,
      );
  if (url.protocol === 'http:' && !isAllowed(ipaddr.process(first.address), settings))
    throw new OutsideError('address', 'Outside the house only https is spoken.');
  return first;
}

export interface OutsideCall {
  method?: 'GET' | 'POST';
  headers?: Record<string, string>;
  body?: string;
  timeoutMs?: number;
  largestBytes?: number;
  resolve?: Resolve;
}
export interface OutsideAnswer {
  status: number;
  contentType: string;
  body: string;
}

const TIMEOUT_MS = 10_000;
const LARGEST_BYTES = 1 << 20;

/**
 * Call another system at an address that somebody typed. The host is resolved once, its address checked, and the
 * connection made to that very address, so that a name which changes in between leads nowhere else. Redirects are
 * answers like others and are not followed.
 *
 * @throws OutsideError
 */
export async function callOutside(
  settings: Settings,
  address: string,
  call: OutsideCall = {},
): Promise<OutsideAnswer> {
  const url = parseOutsideUrl(address);
  const pinned = await resolveOutside(url, settings, call.resolve);
  const lookup: LookupFunction = (_host, options, done) => {
    if (options.all) done(null, [pinned]);
    else done(null, pinned.address, pinned.family);
  };
  const signal = AbortSignal.timeout(call.timeoutMs ?? TIMEOUT_MS);
  const send = url.protocol === 'https:' ? httpsRequest : httpRequest;
  try {
    const answer = await new Promise<IncomingMessage>((resolve, reject) => {
      const body = call.body === undefined ? undefined : Buffer.from(call.body);
      const request = send(url, {
        method: call.method ?? 'GET',
        headers: { ...call.headers, ...(body ? { 'content-length': String(body.length) } : {}) },
        // A connection of its own: a pooled one could lead to an address that was checked for somebody else.
        agent: false,
        lookup,
        signal,
      });
      request.on('response', resolve).on('error', reject).end(body);
    });
    return {
      status: answer.statusCode ?? 0,
      contentType: answer.headers['content-type'] ?? '',
      body: await readBounded(answer, call.largestBytes ?? LARGEST_BYTES),
    };
  } catch (cause) {
    if (cause instanceof OutsideError) throw cause;
    if (signal.aborted) throw new OutsideError('timeout', 'No answer came in time.', { cause });
    const code = (cause as { code?: unknown }).code;
    throw new OutsideError(
      'no-answer',
      `The connection failed${typeof code === 'string' ? ` (${code})` : ''}.`,
      { cause },
    );
  }
}

async function readBounded(answer: IncomingMessage, largest: number): Promise<string> {
  const chunks: Buffer[] = [];
  let total = 0;
  for await (const chunk of answer as AsyncIterable<Buffer>) {
    total += chunk.length;
    if (total > largest) {
      answer.destroy();
      throw new OutsideError('too-large', `The answer is longer than ${largest} bytes.`);
    }
    chunks.push(chunk);
  }
  return Buffer.concat(chunks).toString('utf8');
}

/**
 * Call and read JSON.
 *
 * @throws OutsideError also for a redirect, another status than 200, and what is no JSON object
 */
export async function outsideJson(
  settings: Settings,
  address: string,
  call: OutsideCall = {},
): Promise<Record<string, unknown>> {
  const answer = await callOutside(settings, address, {
    ...call,
    headers: { accept: 'application/json', ...call.headers },
  });
  if (answer.status >= 300 && answer.status < 400)
    throw new OutsideError('redirect', 'It answers with another address, which is not followed.');
  if (answer.status !== 200) throw new OutsideError('no-answer', `It answers ${answer.status}.`);
  let value: unknown;
  try {
    value = JSON.parse(answer.body);
  } catch (cause) {
    throw new OutsideError('no-answer', 'The answer is no JSON.', { cause });
  }
  if (typeof value !== 'object' || value === null || Array.isArray(value))
    throw new OutsideError('no-answer', 'The answer is no JSON object.');
  return value as Record<string, unknown>;
}
