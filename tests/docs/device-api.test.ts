import { createHash } from 'node:crypto';
import { createConfig, lintFromString } from '@redocly/openapi-core';
import Ajv2020 from 'ajv/dist/2020';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { GET } from '@/app/api/device/v1/openapi.json/route';
import type { Device } from '@/devices/agent/device';
import type { SlotAnswer } from '@/lib/contract/device';
import type { ApiDocument } from '@/lib/contract/openapi';
import { DEVICE_OPERATIONS } from '@/lib/contract/operations';
import { ROUTES } from '@/lib/identity/routes';
import { call } from '../support/call';
import { chestWav, clean, openPassageHouse, type PassageHouse } from '../support/passageHouse';

interface Seen {
  path: string;
  status: number;
  type: string;
  headers: Headers;
  body: Record<string, unknown>;
}

let house: PassageHouse;
let document: ApiDocument;
const seen: Seen[] = [];
const ajv = new Ajv2020({ strict: false });

/** What really went over the wire, whatever the agent made of it. */
const watching: typeof fetch = async (input, init) => {
  const response = await fetch(input, init);
  const { pathname } = new URL(String(input));
  if (pathname.startsWith('/api/'))
    seen.push({
      path: pathname,
      status: response.status,
      type: (response.headers.get('content-type') ?? '').split(';')[0] ?? '',
      headers: response.headers,
      body: (await response.clone().json()) as Record<string, unknown>,
    });
  return response;
};

beforeAll(async () => {
  house = await openPassageHouse();
  const answer = await call(GET);
  document = (await answer.json()) as ApiDocument;
  ajv.addSchema(document as object, 'api');
});
afterAll(() => house.close());

const templateOf = (path: string) =>
  path.replace(/recordings\/[^/]+\/complete$/, 'recordings/{recording}/complete');

/** Errors of one answer against the document; none when it says so itself. */
function errorsOf({ path, status, type, headers, body }: Seen): string[] {
  const at = templateOf(path);
  const response = document.paths?.[at]?.post?.responses?.[String(status) as '200'] as
    | { headers?: Record<string, { required?: boolean }>; content?: Record<string, unknown> }
    | undefined;
  if (!response) return [`${at} does not say that it answers ${status}`];
  if (!response.content?.[type]) return [`${at} ${status} does not say that it answers ${type}`];
  const pointer = ['paths', at, 'post', 'responses', String(status), 'content', type, 'schema']
    .map((part) => encodeURIComponent(part.replaceAll('~', '~0').replaceAll('/', '~1')))
    .join('/');
  const missing = Object.entries(response.headers ?? {})
    .filter(([name, { required }]) => required && !headers.has(name))
    .map(([name]) => `${at} ${status} has no ${name}`);
  const validate = ajv.getSchema(`api#/${pointer}`);
  if (!validate) return [`nothing at ${pointer}`];
  return [
    ...missing,
    ...(validate(body)
      ? []
      : (validate.errors ?? []).map((e) => `${at} ${status} ${e.instancePath} ${e.message}`)),
  ];
}

/** Codes that the document names for a status. */
const codesOf = (path: string, status: number): string[] => {
  const response = document.paths?.[templateOf(path)]?.post?.responses?.[String(status) as '400'] as
    | { content?: Record<string, { examples?: Record<string, unknown> }> }
    | undefined;
  return Object.keys(response?.content?.['application/problem+json']?.examples ?? {});
};

const slotBody = (bytes: Uint8Array, number: string, more = {}) => ({
  recordingNumber: number,
  sha256: createHash('sha256').update(bytes).digest('hex'),
  bytes: bytes.length,
  mediaType: 'audio/wav',
  recordedAt: Date.now(),
  deviceTime: Date.now(),
  ...more,
});
const put = async (slot: SlotAnswer, bytes: Uint8Array) => {
  const { 'content-length': _length, host: _host, ...headers } = slot.upload?.headers ?? {};
  await fetch(slot.upload?.url ?? '', { method: 'PUT', headers, body: bytes as Uint8Array<ArrayBuffer> });
};
const refused = (work: Promise<unknown>) =>
  work.then(
    () => 'answered',
    (error: { code: string }) => error.code,
  );

/** Everything a device does well. */
async function goodDay(agent: Device) {
  const bytes = chestWav(clean(), 41);
  const body = slotBody(bytes, 'good');
  await agent.call('/api/device/v1/heartbeat', { deviceTime: Date.now(), batteryPercent: 50 });
  const slot = await agent.call<SlotAnswer>('/api/device/v1/recordings', body);
  await agent.call('/api/device/v1/recordings', body);
  await put(slot, bytes);
  await agent.call(new URL(slot.complete).pathname, {});
  await agent.call('/api/device/v1/recordings', body);
  await agent.call('/api/device/v1/token', {});
  await agent.call('/api/device/v1/token', {});
}

describe('the OpenAPI document', () => {
  test('has no fault that the linter knows of', async () => {
    const config = await createConfig({ extends: ['recommended'] });
    const problems = await lintFromString({ source: JSON.stringify(document), config });
    expect(
      problems.map(({ ruleId, message, location }) => `${ruleId} ${message} ${location[0]?.pointer}`),
    ).toEqual([]);
  });

  test('describes every route of the device API, and no other', () => {
    const routes = Object.keys(ROUTES)
      .filter((key) => key.startsWith('POST /api/device/v1/'))
      .map((key) => key.slice('POST '.length).replace('[id]', '{recording}'));
    expect(Object.keys(document.paths ?? {}).sort()).toEqual(routes.sort());
    expect(DEVICE_OPERATIONS).toHaveLength(routes.length);
  });

  test('says of every member what it is', () => {
    const bare: string[] = [];
    const walk = (
      at: string,
      schema: { properties?: Record<string, object>; items?: object } & Record<string, unknown>,
    ) => {
      for (const [name, member] of Object.entries(schema.properties ?? {})) {
        const one = member as Record<string, unknown>;
        const said = one.description ?? one.$ref ?? one.const ?? one.enum ?? one.items;
        if (!said) bare.push(`${at}.${name}`);
        walk(`${at}.${name}`, one as never);
      }
    };
    for (const id of ['EnrolRequest', 'SlotRequest', 'HeartbeatRequest', 'Credential', 'Slot', 'Heartbeat'])
      walk(id, document.components?.schemas?.[id] as never);
    expect(bare).toEqual([]);
  });

  test('is what the routes answer on a good day', async () => {
    seen.length = 0;
    const { agent } = await house.enrolled({}, { fetch: watching });
    await goodDay(agent);
    expect(seen.flatMap(errorsOf)).toEqual([]);
    const statuses = new Set(seen.map(({ path, status }) => `${templateOf(path)} ${status}`));
    for (const { path, answers } of DEVICE_OPERATIONS)
      for (const { status } of answers)
        if (!(path.endsWith('/enrol') && status === 200)) expect(statuses).toContain(`${path} ${status}`);
  });

  test('is what the routes answer on a bad day, each code under the status that names it', async () => {
    const { agent } = await house.enrolled({}, { fetch: watching });
    const bytes = chestWav(clean(), 42);
    seen.length = 0;
    const codes = new Set([
      await refused(agent.call('/api/device/v1/heartbeat', { deviceTime: 'now' })),
      await refused(agent.call('/api/device/v1/heartbeat', { deviceTime: 1, more: 'x'.repeat(20_000) })),
      await refused(agent.api.call('/api/device/v1/heartbeat', { deviceTime: 1 })),
      await refused(
        agent.call('/api/device/v1/recordings', slotBody(bytes, 'video', { mediaType: 'video/mp4' })),
      ),
      await refused(
        agent.call('/api/device/v1/recordings', slotBody(bytes, 'huge', { bytes: 4_000_000_000 })),
      ),
      await refused(agent.call('/api/device/v1/recordings/AAAA-AAAA/complete', {})),
      await refused(agent.api.call('/api/device/v1/enrol', { code: 'x' })),
      await refused(
        agent.api.call('/api/device/v1/enrol', {
          code: '7K3F92QX4M',
          serialNumber: 'none',
          publicKey: agent.keys.publicJwk,
          proof: 'a.b.c',
        }),
      ),
    ]);
    const slot = await agent.call<SlotAnswer>('/api/device/v1/recordings', slotBody(bytes, 'taken'));
    codes.add(
      await refused(agent.call('/api/device/v1/recordings', slotBody(chestWav(clean(), 43), 'taken'))),
    );
    codes.add(await refused(agent.call(new URL(slot.complete).pathname, {})));
    await house.services.storage.put({
      key: await slotKeyOf(slot.recording),
      body: Buffer.from('other bytes'),
      contentType: 'audio/wav',
    });
    codes.add(await refused(agent.call(new URL(slot.complete).pathname, {})));
    expect([...codes].sort()).toEqual([
      'body-invalid',
      'body-too-large',
      'bytes-mismatch',
      'bytes-missing',
      'enrolment-refused',
      'media-type-refused',
      'not-found',
      'recording-conflict',
      'recording-too-large',
      'token-invalid',
    ]);
    expect(seen.flatMap(errorsOf)).toEqual([]);
    for (const { path, status, body } of seen.filter((one) => one.status >= 400))
      expect(codesOf(path, status)).toContain(String(body.type).split('/').at(-1));
  });
});

async function slotKeyOf(number: string): Promise<string> {
  const row = await house.services.read.query.recording.findFirst({
    where: (t, { eq }) => eq(t.number, number),
  });
  return row?.slotKey ?? '';
}
