import { afterAll, afterEach, beforeAll, expect, test } from 'vitest';
import { POST as saveRoute } from '@/app/api/connections/[kind]/route';
import { POST as testRoute } from '@/app/api/connections/[kind]/test/route';
import { readConnections } from '@/lib/connections/readConnections';
import { readConnection } from '@/lib/platform/connectionSetting';
import { call, problemOf } from '../../support/call';
import { entriesOf } from '../../support/entries';
import { type OutsideServer, outsideServer, sendJson } from '../../support/outsideServer';
import { authorityOf, signedIn } from '../../support/people';
import { type House, openHouse } from '../../support/services';

let house: House;
let admin: Awaited<ReturnType<typeof signedIn>>;
let fhir: OutsideServer;
const fhirSays = { version: '4.0.1', patients: 200 };

beforeAll(async () => {
  house = await openHouse({ storage: true, env: { PRIVATE_ADDRESSES_ALLOWED: '127.0.0.0/8' } });
  admin = await signedIn(house, { roles: ['itadmin'] });
  fhir = await outsideServer(({ path }, response) => {
    if (path === '/fhir/metadata')
      sendJson(response, 200, { resourceType: 'CapabilityStatement', fhirVersion: fhirSays.version });
    else if (path.startsWith('/fhir/Patient'))
      sendJson(response, fhirSays.patients, {
        resourceType: 'Bundle',
        entry: [{ resource: { name: 'Ashgrove' } }],
      });
    else sendJson(response, 404, {});
  });
});
afterAll(async () => {
  await fhir.close();
  await house.close();
});
afterEach(() => {
  fhirSays.version = '4.0.1';
  fhirSays.patients = 200;
});

interface Tested {
  ok: boolean;
  steps: { name: string; ok: boolean; detail: string }[];
}
const tryOut = async (kind: string): Promise<Tested> => {
  const answer = await call(testRoute, { params: { kind }, body: {}, cookie: admin.cookie });
  expect(answer.status).toBe(200);
  return (await answer.json()) as Tested;
};
const save = (kind: string, body: Record<string, unknown>) =>
  call(saveRoute, { params: { kind }, body: { reason: 'As agreed', ...body }, cookie: admin.cookie });
const versionOf = async (kind: string) =>
  (await readConnections(house.services, authorityOf<'connections.read'>(admin))).find(
    (line) => line.kind === kind,
  )?.settable?.version ?? 0;

test('storage is tested with an object of its own, and nothing of it stays', async () => {
  const { ok, steps } = await tryOut('storage');
  expect(steps.filter((step) => !step.ok)).toEqual([]);
  expect(ok).toBe(true);
  const told = Object.fromEntries(steps.map(({ name, detail }) => [name, detail]));
  expect(told.checksum).toBe('bytes with another SHA-256 are refused');
  expect(told.lock).toMatch(/lock/);
  expect((await house.services.storage.list('checks/')).entries).toEqual([]);
});

test('storage that does not answer fails at its first step, and says so', async () => {
  const broken = await openHouse();
  try {
    const person = await signedIn(broken, { roles: ['itadmin'] });
    const answer = await call(testRoute, { params: { kind: 'storage' }, body: {}, cookie: person.cookie });
    const { ok, steps } = (await answer.json()) as Tested;
    expect(ok).toBe(false);
    expect(steps[0]).toMatchObject({ name: 'write', ok: false });
  } finally {
    await broken.close();
  }
});

test('mail is tested by a message to whoever pressed', async () => {
  // The house that was opened last is the one that routes find.
  const own = await openHouse();
  try {
    const person = await signedIn(own, { roles: ['itadmin'] });
    const answer = await call(testRoute, { params: { kind: 'mail' }, body: {}, cookie: person.cookie });
    expect(((await answer.json()) as Tested).ok).toBe(true);
    expect(own.mail.map(({ to }) => to)).toEqual([person.email]);
    const entry = (await entriesOf(own)).at(-1);
    expect(entry).toMatchObject({ kind: 'connection-tested', detail: { connection: 'mail', ok: true } });
  } finally {
    await own.close();
  }
});

test('a mail server that refuses is said so without its words', async () => {
  const own = await openHouse({
    overrides: {
      mail: {
        kind: 'smtp',
        send: async () => {
          throw Object.assign(new Error('535 user bellkeep password hunter2'), { code: 'EAUTH' });
        },
      },
    },
  });
  try {
    const person = await signedIn(own, { roles: ['itadmin'] });
    const answer = await call(testRoute, { params: { kind: 'mail' }, body: {}, cookie: person.cookie });
    expect(((await answer.json()) as Tested).steps).toEqual([
      { name: 'hand a message over', ok: false, detail: 'failed (EAUTH)' },
    ]);
  } finally {
    await own.close();
  }
});

test('the record system is asked for its capabilities and a patient, by the token that was set', async () => {
  const { provideServices } = await import('@/lib/http/services');
  provideServices(house.services);
  const saved = await save('record-system', {
    settings: { baseUrl: `${fhir.origin}/fhir/` },
    secret: 'fhir-token',
    version: 0,
  });
  expect(await saved.json()).toEqual({ version: 1 });
  const { ok, steps } = await tryOut('record-system');
  expect(steps.map(({ name }) => name)).toEqual(['settings', 'capabilities', 'search patients']);
  expect(ok).toBe(true);
  expect(fhir.asked.map(({ path }) => path)).toEqual(['/fhir/metadata', '/fhir/Patient?_count=1']);
  expect(fhir.asked[0]?.headers.authorization).toBe('Bearer fhir-token');
  const text = JSON.stringify([await entriesOf(house), steps, house.log]);
  expect(text).not.toContain('Ashgrove');
  expect(text).not.toContain('fhir-token');
});

test('a record system of another age, or one that refuses, fails at that step', async () => {
  fhirSays.version = '3.0.2';
  expect((await tryOut('record-system')).steps[1]).toEqual({
    name: 'capabilities',
    ok: false,
    detail: 'it speaks FHIR 3.0.2; R4 is needed',
  });
  fhirSays.version = '4.0.1';
  fhirSays.patients = 401;
  expect((await tryOut('record-system')).steps[2]).toMatchObject({ ok: false, detail: 'It answers 401.' });
});

test('the secret stays when it is left out, and is gone with null', async () => {
  const settings = { baseUrl: `${fhir.origin}/fhir` };
  await save('record-system', { settings, version: await versionOf('record-system') });
  expect((await readConnection(house.services, 'record-system'))?.secret).toBe('fhir-token');
  await save('record-system', { settings, secret: null, version: await versionOf('record-system') });
  expect((await readConnection(house.services, 'record-system'))?.secret).toBeNull();
});

test.each([
  'http://169.254.169.254/fhir',
  'http://10.0.0.8/fhir',
  'http://[::1]/fhir',
  'https://localhost.localdomain@10.1.1.1/',
])('%s is refused when it is typed', async (baseUrl) => {
  const answer = await save('record-system', {
    settings: { baseUrl },
    version: await versionOf('record-system'),
  });
  const { code, body } = await problemOf(answer);
  expect(code).toBe('body-invalid');
  expect(body.errors).toEqual([expect.objectContaining({ path: 'settings.baseUrl' })]);
});

test('of two who change it at once one is told, and both wordings are not mixed', async () => {
  const version = await versionOf('record-system');
  const bodies = ['a', 'b'].map((path) => ({ settings: { baseUrl: `${fhir.origin}/${path}` }, version }));
  const answers = await Promise.all(bodies.map((body) => save('record-system', body)));
  expect(answers.map(({ status }) => status).sort()).toEqual([200, 409]);
});

test('emptied, it is not reached, whatever the environment says', async () => {
  const env = { ...house.services.env, RECORD_SYSTEM_URL: 'https://records.example/fhir' };
  await save('record-system', { settings: {}, version: await versionOf('record-system') });
  expect(await readConnection({ ...house.services, env }, 'record-system')).toBeNull();
  expect((await tryOut('record-system')).steps[0]).toMatchObject({ ok: false, detail: 'no address is set' });
});

test('what was never set here is as the environment says', async () => {
  const env = {
    ...house.services.env,
    SIGN_ON_ISSUER: 'https://id.example',
    SIGN_ON_CLIENT_ID: 'bellkeep',
    SIGN_ON_CLIENT_SECRET: 'hush',
  };
  expect(await readConnection({ ...house.services, env }, 'single-sign-on')).toEqual({
    settings: {
      issuer: 'https://id.example',
      clientId: 'bellkeep',
      name: 'the hospital’s account',
      providerSecondFactor: false,
    },
    secret: 'hush',
    version: 0,
  });
});
