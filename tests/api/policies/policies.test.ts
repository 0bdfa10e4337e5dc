import { eq } from 'drizzle-orm';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { POST as previewRoute } from '@/app/api/policies/[kind]/preview/route';
import { POST as changeRoute } from '@/app/api/policies/[kind]/route';
import { credential } from '@/db/schema';
import { renewAfter } from '@/lib/keys/issueCredential';
import { currentPolicy } from '@/lib/policy/currentPolicy';
import { initialSettings, POLICY_KINDS, type PolicyKind } from '@/lib/policy/kinds';
import { readPolicy } from '@/lib/policy/readPolicies';
import { call, problemOf } from '../../support/call';
import { entriesOf } from '../../support/entries';
import { openPassageHouse, type PassageHouse } from '../../support/passageHouse';
import { authorityOf, signedIn } from '../../support/people';

const DAY_MS = 86_400_000;
let house: PassageHouse;
let admin: Awaited<ReturnType<typeof signedIn>>;
beforeAll(async () => {
  house = await openPassageHouse();
  admin = await signedIn(house, { roles: ['itadmin'] });
});
afterAll(() => house.close());

const change = (kind: string, body: unknown, more = {}) =>
  call(changeRoute, {
    params: { kind },
    body,
    cookie: admin.cookie,
    headers: { origin: house.origin },
    ...more,
  });
const preview = (kind: string, settings: unknown) =>
  call(previewRoute, {
    params: { kind },
    body: { settings },
    cookie: admin.cookie,
    headers: { origin: house.origin },
  });
const wanted = (more: Record<string, number> = {}) => ({ ...initialSettings('credentials'), ...more });
const credentialOf = async (deviceId: string) => {
  const [row] = await house.services.read.select().from(credential).where(eq(credential.deviceId, deviceId));
  if (!row) throw new Error('no credential');
  return row;
};

test('every kind has initial values that its own schema admits, and a history that is empty', async () => {
  for (const kind of Object.keys(POLICY_KINDS) as PolicyKind[]) {
    expect(await currentPolicy(house.services.read, kind)).toEqual({
      version: 0,
      settings: initialSettings(kind),
    });
    const described = await readPolicy(house.services, authorityOf<'policy.read'>(admin), kind);
    expect(described?.history).toEqual([]);
    expect((await preview(kind, initialSettings(kind))).status).toBe(200);
  }
});

test('until somebody decides, retention is what the environment says', async () => {
  const env = { ...house.services.env, RETENTION_YEARS: 12 };
  expect((await currentPolicy(house.services.read, 'retention', env)).settings.originalYears).toBe(12);
});

test('a preview says how many credentials would end sooner and writes nothing', async () => {
  const { id } = await house.enrolled();
  const row = await credentialOf(id);
  await house.services.write(async (tx) => {
    await tx
      .update(credential)
      .set({ issuedAt: row.issuedAt - 30 * DAY_MS })
      .where(eq(credential.id, row.id));
  });
  const before = (await entriesOf(house)).length;
  const answer = await preview('credentials', wanted({ boundLifetimeDays: 40 }));
  const { effects, version } = (await answer.json()) as {
    effects: { text: string; count: number }[];
    version: number;
  };
  expect(version).toBe(0);
  expect(effects[0]).toMatchObject({ count: 1 });
  expect(effects[1]).toMatchObject({ count: 1 });
  expect(effects[0]?.text).toContain('would end sooner');
  expect((await entriesOf(house)).length).toBe(before);
  expect((await credentialOf(id)).renewAfter).toBe(row.renewAfter);
});

test('a decision is in force at once: for what is issued, for what exists, and in the log with its reason', async () => {
  const { agent, id } = await house.enrolled();
  const old = await credentialOf(id);
  const answer = await change('credentials', {
    settings: wanted({ boundLifetimeDays: 30, boundRenewBeforeDays: 10 }),
    version: 0,
    reason: 'The security board asked for it',
  });
  expect(await answer.json()).toMatchObject({ version: 1, settings: { boundLifetimeDays: 30 } });
  const now = await credentialOf(id);
  expect(now.expiresAt).toBe(old.expiresAt);
  expect(renewAfter(now)).toBe(old.issuedAt + 20 * DAY_MS);
  const { id: later } = await house.enrolled();
  const fresh = await credentialOf(later);
  expect(fresh.expiresAt - fresh.issuedAt).toBe(30 * DAY_MS);
  expect(await agent.call('/api/device/v1/heartbeat', { deviceTime: Date.now() })).toMatchObject({
    renew: false,
  });
  const entry = (await entriesOf(house)).find(({ kind }) => kind === 'policy-changed');
  expect(entry).toMatchObject({
    actor: { kind: 'person', id: admin.id, role: 'itadmin' },
    subjects: [{ kind: 'policy', id: 'credentials' }],
    detail: { version: 1, reason: 'The security board asked for it' },
    before: { boundLifetimeDays: 90, boundRenewBeforeDays: 21 },
    after: { boundLifetimeDays: 30, boundRenewBeforeDays: 10 },
  });
});

test('of two who decide on the same version one is told what is in force', async () => {
  const { version } = await currentPolicy(house.services.read, 'clock');
  const body = (seconds: number) => ({
    settings: { ...initialSettings('clock'), deviceNoticeSeconds: seconds },
    version,
    reason: 'Too many notices',
  });
  const answers = await Promise.all([change('clock', body(600)), change('clock', body(900))]);
  expect(answers.map(({ status }) => status).sort()).toEqual([200, 409]);
  const refused = answers.find(({ status }) => status === 409);
  const { code, body: problem } = await problemOf(refused as Response);
  expect(code).toBe('stale');
  const current = await currentPolicy(house.services.read, 'clock');
  expect(problem).toMatchObject({ version: version + 1, settings: current.settings });
});

test('the same decision sent again with its key is made once', async () => {
  const { version, settings } = await currentPolicy(house.services.read, 'retention');
  const body = { settings: { ...settings, originalYears: 10 }, version, reason: 'Law of the land' };
  const key = { headers: { origin: house.origin, 'idempotency-key': 'retention-once' } };
  const [first, again] = [await change('retention', body, key), await change('retention', body, key)];
  expect(await again.json()).toEqual(await first.json());
  expect(again.headers.get('idempotency-replayed')).toBe('true');
  expect((await currentPolicy(house.services.read, 'retention')).version).toBe(version + 1);
});

test('asking for a second person is in force where the ledger looks it up', async () => {
  const answer = await change('evidence', {
    settings: { secondPerson: true },
    version: 0,
    reason: 'Four eyes',
  });
  expect(answer.status).toBe(200);
  const row = await house.services.read.query.evidencePolicy.findFirst();
  expect(row).toMatchObject({ version: 1, secondPerson: true, madeBy: admin.id });
});

test.each([
  ['a lifetime of nought days', { boundLifetimeDays: 0 }],
  ['half a day', { boundLifetimeDays: 1.5 }],
  ['renewal before it is issued', { boundRenewBeforeDays: 90, boundLifetimeDays: 60 }],
  ['a field that no policy has', { more: 1 }],
])('%s is refused, with the field', async (_what, more) => {
  const answer = await change('credentials', { settings: wanted(more), version: 1, reason: 'Just because' });
  const { code, body } = await problemOf(answer);
  expect(code).toBe('body-invalid');
  expect(JSON.stringify(body.errors)).toContain('settings');
});

test('a decision without a reason, without a change or of no kind is refused', async () => {
  const { version, settings } = await currentPolicy(house.services.read, 'credentials');
  expect((await change('credentials', { settings, version, reason: '' })).status).toBe(400);
  expect(
    (await problemOf(await change('credentials', { settings, version, reason: 'No change' }))).code,
  ).toBe('not-possible');
  expect((await change('tea', { settings: {}, version: 0, reason: 'Milk first' })).status).toBe(404);
});

test('the history tells each version against the one before it', async () => {
  const described = await readPolicy(house.services, authorityOf<'policy.read'>(admin), 'credentials');
  expect(described?.history).toEqual([
    expect.objectContaining({
      version: 1,
      madeBy: admin.name,
      changes: [
        { label: 'Bound credentials live', unit: 'days', before: 90, after: 30 },
        { label: 'They are renewed before their end', unit: 'days', before: 21, after: 10 },
      ],
    }),
  ]);
});

test.each([
  "update policy_version set reason = 'other'",
  'delete from policy_version',
  "insert or replace into policy_version (kind, version, settings, reason, made_by, made_at) values ('credentials', 1, '{}', 'x', 'y', 1)",
])('the database refuses: %s', async (statement) => {
  await expect(house.services.database.client.execute(statement)).rejects.toThrow(
    /policies are changed|UNIQUE/,
  );
});
