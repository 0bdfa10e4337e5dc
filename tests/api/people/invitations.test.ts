import { eq } from 'drizzle-orm';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { POST as signInRoute } from '@/app/api/auth/sign-in/route';
import { POST as sendAgainRoute } from '@/app/api/invitations/[id]/send-again/route';
import { POST as withdrawRoute } from '@/app/api/invitations/[id]/withdraw/route';
import { POST as acceptRoute } from '@/app/api/invitations/accept/route';
import { POST as inviteRoute, GET as listRoute } from '@/app/api/invitations/route';
import { GET as me } from '@/app/api/me/route';
import { POST as leaveRoute } from '@/app/api/people/[id]/leave/route';
import { account, invitation, user } from '@/db/schema';
import { call, cookiesAfter, problemOf } from '@/tests/support/call';
import { entriesOf, kindsOf } from '@/tests/support/entries';
import { addWard, signedIn, type TestPerson } from '@/tests/support/people';
import { type House, openHouse } from '@/tests/support/services';

const PASSWORD = 'tangerine otter quarry';
let house: House;
let admin: TestPerson & { cookie: string };
let alder: string;
beforeEach(async () => {
  house = await openHouse();
  admin = await signedIn(house, { roles: ['itadmin'], name: 'Tomasz Abara' });
  alder = await addWard(house, 'Alder');
});
afterEach(() => house.close());

const wanted = () => ({
  email: 'Amara@Harrowmere.example',
  name: 'Dr Amara Stone',
  jobTitle: 'Cardiology',
  roles: ['clinician'],
  wardIds: [alder],
});
const invite = (body: Record<string, unknown> = wanted(), headers: Record<string, string> = {}) =>
  call(inviteRoute, { body, cookie: admin.cookie, headers });
const accept = (token: string, password = PASSWORD) => call(acceptRoute, { body: { token, password } });
const act = (route: typeof withdrawRoute, id: string) =>
  call(route, { method: 'POST', params: { id }, cookie: admin.cookie });

async function lastToken(): Promise<string> {
  const { text } = (await house.deliver()).at(-1) ?? { text: '' };
  return /\/invite\/([\w-]+)/.exec(text)?.[1] ?? '';
}
async function invited(): Promise<{ id: string; token: string }> {
  const { id } = (await (await invite()).json()) as { id: string };
  return { id, token: await lastToken() };
}

describe('an invitation', () => {
  test('comes by mail in plain words and leads to an account with its roles and wards', async () => {
    const { token } = await invited();
    expect(house.mail.at(-1)).toMatchObject({
      to: 'amara@harrowmere.example',
      text: expect.stringContaining('Tomasz Abara invites you to Bellkeep as clinician.'),
    });
    expect(await (await accept(token)).json()).toEqual({ email: 'amara@harrowmere.example' });
    const answer = await call(signInRoute, {
      body: { email: 'amara@harrowmere.example', password: PASSWORD },
    });
    const person = await (await call(me, { cookie: cookiesAfter(answer) })).json();
    expect(person).toMatchObject({
      name: 'Dr Amara Stone',
      jobTitle: 'Cardiology',
      roles: ['clinician'],
      wardIds: [alder],
    });
    expect(await kindsOf(house)).toEqual(['person-invited', 'person-joined', 'signed-in']);
    expect((await entriesOf(house))[1]).toMatchObject({
      actor: { kind: 'person', label: 'Dr Amara Stone' },
      after: { roles: ['clinician'], wards: ['Alder'] },
    });
  });

  test('keeps the hash of its token and not the token', async () => {
    const { token } = await invited();
    const rows = await house.services.database.client.execute('select * from invitation');
    expect(token).toHaveLength(43);
    expect(JSON.stringify(rows.rows)).not.toContain(token);
    expect(house.log.join()).not.toContain(token);
  });

  test('taken up twice at the same moment gives one account', async () => {
    const { token } = await invited();
    const answers = await Promise.all([accept(token), accept(token, 'mulberry anvil sextant')]);
    expect(answers.map(({ status }) => status).sort()).toEqual([201, 404]);
    const people = await house.services.read.select().from(user).where(eq(user.name, 'Dr Amara Stone'));
    expect(people).toHaveLength(1);
    expect(
      await house.services.read
        .select()
        .from(account)
        .where(eq(account.userId, people[0]?.id ?? '')),
    ).toHaveLength(1);
  });

  test('works no second time', async () => {
    const { token } = await invited();
    await accept(token);
    expect((await problemOf(await accept(token))).code).toBe('not-found');
  });

  test('stays open when the password will not do', async () => {
    const { token } = await invited();
    expect((await problemOf(await accept(token, 'amarastone2026'))).body).toMatchObject({
      errors: [{ path: 'password' }],
    });
    expect((await accept(token)).status).toBe(201);
  });

  test('ends after seven days', async () => {
    const { token } = await invited();
    house.clock.advance(7 * 86_400_000 + 1);
    expect((await accept(token)).status).toBe(404);
    expect(await house.services.read.select().from(user)).toHaveLength(1);
  });

  test('can be withdrawn, and then not taken up, and not withdrawn again', async () => {
    const { id, token } = await invited();
    expect((await act(withdrawRoute, id)).status).toBe(200);
    expect((await accept(token)).status).toBe(404);
    expect((await problemOf(await act(withdrawRoute, id))).body.detail).toBe(
      'The invitation of Dr Amara Stone was withdrawn already.',
    );
  });

  test('taken up cannot be withdrawn', async () => {
    const { id, token } = await invited();
    await accept(token);
    expect((await problemOf(await act(withdrawRoute, id))).code).toBe('not-possible');
  });

  test('sent again ends the address of the mail before', async () => {
    const { id, token } = await invited();
    house.clock.advance(6 * 86_400_000);
    const again = await call(sendAgainRoute, {
      method: 'POST',
      params: { id },
      cookie: (await signedIn(house, { roles: ['itadmin'] })).cookie,
    });
    expect(again.status).toBe(200);
    const fresh = await lastToken();
    house.clock.advance(6 * 86_400_000);
    expect((await accept(token)).status).toBe(404);
    expect((await accept(fresh)).status).toBe(201);
  });

  test('is refused for an address that has an account or an open invitation', async () => {
    const here = await problemOf(await invite({ ...wanted(), email: admin.email }));
    expect(here.body.detail).toContain('Tomasz Abara has an account');
    await invited();
    const open = await problemOf(await invite());
    expect(open.body.detail).toContain('Dr Amara Stone has an open invitation');
    expect(await house.services.read.select().from(invitation)).toHaveLength(1);
  });

  test('brings somebody who left back as the same person', async () => {
    const { token } = await invited();
    await accept(token);
    const [before] = await house.services.read.select().from(user).where(eq(user.name, 'Dr Amara Stone'));
    await call(leaveRoute, {
      body: { reason: 'moved to another hospital' },
      params: { id: before?.id ?? '' },
      cookie: admin.cookie,
    });
    await invite({ ...wanted(), roles: ['auditor'], wardIds: [] });
    expect((await accept(await lastToken())).status).toBe(201);
    const [after] = await house.services.read.select().from(user).where(eq(user.name, 'Dr Amara Stone'));
    expect(after).toMatchObject({ id: before?.id, leftAt: null });
  });

  test.each([
    ['no role', { roles: [] }, 'roles'],
    ['a role that is none', { roles: ['root'] }, 'roles.0'],
    ['a ward that is not there', { wardIds: ['elsewhere'] }, 'wardIds'],
    ['a second line in the name', { name: 'Amara\r\nBcc: all@harrowmere.example' }, 'name'],
    ['something that is no address', { email: 'amara' }, 'email'],
    ['a second address', { email: 'a@b.example, c@d.example' }, 'email'],
  ])('with %s is refused and nothing is sent', async (_, change, path) => {
    const refused = await problemOf(await invite({ ...wanted(), ...change }));
    expect(refused.body).toMatchObject({ errors: [{ path }] });
    expect(await house.deliver()).toEqual([]);
  });

  test('sent twice with one key is one invitation and one mail, and says that it is a repeat', async () => {
    const key = { 'idempotency-key': 'invite-amara-1' };
    const first = await invite(wanted(), key);
    const second = await invite(wanted(), key);
    expect(await second.json()).toEqual(await first.json());
    expect(first.headers.get('idempotency-replayed')).toBeNull();
    expect(second.headers.get('idempotency-replayed')).toBe('true');
    expect(await house.deliver()).toHaveLength(1);
  });

  test('sent twice with one key at the same moment is one invitation, and both are told so', async () => {
    const key = { 'idempotency-key': 'invite-amara-2' };
    const answers = await Promise.all([invite(wanted(), key), invite(wanted(), key), invite(wanted(), key)]);
    const ids = await Promise.all(
      answers.map(async (answer) => ((await answer.json()) as { id: string }).id),
    );
    expect(answers.map(({ status }) => status)).toEqual([201, 201, 201]);
    expect(new Set(ids).size).toBe(1);
    expect(await house.services.read.select().from(invitation)).toHaveLength(1);
  });

  test('another one under the same key is refused', async () => {
    const key = { 'idempotency-key': 'invite-amara-3' };
    await invite(wanted(), key);
    const other = await invite({ ...wanted(), name: 'Somebody Else' }, key);
    expect((await problemOf(other)).code).toBe('idempotency-conflict');
  });

  test('one person’s key says nothing to another', async () => {
    const key = { 'idempotency-key': 'invite-amara-4' };
    await invite(wanted(), key);
    const second = await signedIn(house, { roles: ['itadmin'] });
    const other = await call(inviteRoute, {
      body: { ...wanted(), email: 'other@harrowmere.example' },
      cookie: second.cookie,
      headers: key,
    });
    expect(other.status).toBe(201);
  });

  test('shows in the list of its kind, page by page', async () => {
    for (let i = 0; i < 5; i++) {
      house.clock.advance(1000);
      await invite({ ...wanted(), email: `p${i}@harrowmere.example`, name: `Person ${i}` });
    }
    const page = async (query: string) =>
      (await (await call(listRoute, { path: `/api/invitations${query}`, cookie: admin.cookie })).json()) as {
        rows: { name: string }[];
        next: string | null;
        counts: Record<string, number>;
      };
    const first = await page('?limit=3');
    expect(first.rows.map(({ name }) => name)).toEqual(['Person 4', 'Person 3', 'Person 2']);
    expect(first.counts).toEqual({ open: 5, accepted: 0, withdrawn: 0, ended: 0 });
    const second = await page(`?limit=3&after=${first.next}`);
    expect(second.rows.map(({ name }) => name)).toEqual(['Person 1', 'Person 0']);
    expect(second.next).toBeNull();
    house.clock.advance(7 * 86_400_000);
    const late = await signedIn(house, { roles: ['itadmin'] });
    const ended = await call(listRoute, { path: '/api/invitations?view=ended', cookie: late.cookie });
    expect(((await ended.json()) as { rows: unknown[] }).rows).toHaveLength(5);
  });
});
