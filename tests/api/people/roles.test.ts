import { eq } from 'drizzle-orm';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { POST as signInRoute } from '@/app/api/auth/sign-in/route';
import { GET as credentials } from '@/app/api/credentials/route';
import { GET as me } from '@/app/api/me/route';
import { POST as endSessionsRoute } from '@/app/api/people/[id]/end-sessions/route';
import { POST as leaveRoute } from '@/app/api/people/[id]/leave/route';
import { POST as removeFactorRoute } from '@/app/api/people/[id]/remove-second-factor/route';
import { POST as rolesRoute } from '@/app/api/people/[id]/roles/route';
import { GET as personRoute } from '@/app/api/people/[id]/route';
import { POST as wardsRoute } from '@/app/api/people/[id]/wards/route';
import { personRole, twoFactor, user } from '@/db/schema';
import type { Role } from '@/lib/identity/permissions';
import { newId } from '@/lib/platform/ids';
import { call, problemOf } from '@/tests/support/call';
import { entriesOf, kindsOf } from '@/tests/support/entries';
import { addWard, PASSWORD, sessionOf, signedIn, type TestPerson } from '@/tests/support/people';
import { type House, openHouse } from '@/tests/support/services';

type SignedIn = TestPerson & { cookie: string };
let house: House;
let admin: SignedIn;
beforeEach(async () => {
  house = await openHouse();
  admin = await signedIn(house, { roles: ['itadmin'] });
});
afterEach(() => house.close());

const role = (by: SignedIn, id: string, change: { role: Role; held: boolean }) =>
  call(rolesRoute, { body: change, params: { id }, cookie: by.cookie });
const take = (by: SignedIn, id: string, taken: Role) => role(by, id, { role: taken, held: false });
const give = (by: SignedIn, id: string, given: Role) => role(by, id, { role: given, held: true });
const rolesOf = async (id: string) =>
  (await house.services.read.select().from(personRole).where(eq(personRole.personId, id)))
    .map((row) => row.role)
    .sort();

describe('roles', () => {
  test('a role that is taken away is gone at once, with every session', async () => {
    const person = await signedIn(house, { roles: ['itadmin', 'auditor'] });
    const elsewhere = await sessionOf(house, person);
    expect((await call(credentials, { cookie: person.cookie })).status).toBe(200);
    expect(await (await take(admin, person.id, 'itadmin')).json()).toEqual({
      roles: ['auditor'],
      sessionsEnded: 2,
    });
    for (const cookie of [person.cookie, elsewhere])
      expect((await call(credentials, { cookie })).status).toBe(401);
    const fresh = await sessionOf(house, person);
    expect((await call(credentials, { cookie: fresh })).status).toBe(404);
    expect((await entriesOf(house)).at(-1)).toMatchObject({
      kind: 'role-taken',
      actor: { id: admin.id, role: 'itadmin' },
      before: { roles: ['itadmin', 'auditor'] },
      after: { roles: ['auditor'] },
    });
  });

  test('a role that is given ends the sessions too, and is there with the next one', async () => {
    const person = await signedIn(house, { roles: ['auditor'], secondFactor: true });
    expect((await give(admin, person.id, 'itadmin')).status).toBe(200);
    expect((await call(me, { cookie: person.cookie })).status).toBe(401);
    const fresh = await sessionOf(house, person);
    expect((await call(credentials, { cookie: fresh })).status).toBe(200);
  });

  test('the last IT administrator stays one', async () => {
    await give(admin, admin.id, 'auditor');
    const again = { ...admin, cookie: await sessionOf(house, admin) };
    const refused = await problemOf(await take(again, admin.id, 'itadmin'));
    expect(refused.code).toBe('not-possible');
    expect(refused.body.detail).toContain('last IT administrator');
    expect(await rolesOf(admin.id)).toEqual(['auditor', 'itadmin']);
  });

  test('two administrators who take it from each other at the same moment leave one', async () => {
    const other = await signedIn(house, { roles: ['itadmin', 'auditor'] });
    await give(other, admin.id, 'auditor');
    const first = { ...admin, cookie: await sessionOf(house, admin) };
    await Promise.all([take(first, other.id, 'itadmin'), take(other, first.id, 'itadmin')]);
    const left = [await rolesOf(first.id), await rolesOf(other.id)].filter((held) =>
      held.includes('itadmin'),
    );
    expect(left).toHaveLength(1);
  });

  test('somebody who left does not count as an administrator, whatever roles they held', async () => {
    const other = await signedIn(house, { roles: ['itadmin'] });
    await house.services.write(async (tx) => {
      await tx.update(user).set({ leftAt: 1 }).where(eq(user.id, other.id));
    });
    await give(admin, admin.id, 'auditor');
    const again = { ...admin, cookie: await sessionOf(house, admin) };
    expect((await problemOf(await take(again, admin.id, 'itadmin'))).code).toBe('not-possible');
  });

  test('the only role of a person is not taken', async () => {
    const person = await signedIn(house, { roles: ['clinician'] });
    expect((await problemOf(await take(admin, person.id, 'clinician'))).code).toBe('not-possible');
    expect((await call(me, { cookie: person.cookie })).status).toBe(200);
  });

  test('a role that is held is not given again, and one that is not held not taken', async () => {
    const person = await signedIn(house, { roles: ['clinician', 'auditor'] });
    expect((await problemOf(await give(admin, person.id, 'clinician'))).code).toBe('not-possible');
    expect((await problemOf(await take(admin, person.id, 'biomed'))).code).toBe('not-possible');
    expect(await kindsOf(house)).toEqual([]);
  });

  test('of two who give the same role at the same moment one does', async () => {
    const person = await signedIn(house, { roles: ['clinician'] });
    const answers = await Promise.all([give(admin, person.id, 'auditor'), give(admin, person.id, 'auditor')]);
    expect(answers.map(({ status }) => status).sort()).toEqual([200, 409]);
    expect(await kindsOf(house)).toEqual(['role-given']);
  });
});

describe('wards', () => {
  const setWards = (id: string, before: string[], after: string[]) =>
    call(wardsRoute, { body: { before, after }, params: { id }, cookie: admin.cookie });

  test('hold from the next request on, without a new sign-in', async () => {
    const [alder, birch] = [await addWard(house, 'Alder'), await addWard(house, 'Birch')];
    const person = await signedIn(house, { roles: ['clinician'], wardIds: [alder] });
    expect((await setWards(person.id, [alder], [birch])).status).toBe(200);
    const now = await (await call(me, { cookie: person.cookie })).json();
    expect(now).toMatchObject({ wardIds: [birch] });
    expect((await entriesOf(house)).at(-1)).toMatchObject({
      kind: 'wards-changed',
      before: { wards: ['Alder'] },
      after: { wards: ['Birch'] },
    });
  });

  test('changed by somebody else in the meantime are not overwritten', async () => {
    const [alder, birch] = [await addWard(house, 'Alder'), await addWard(house, 'Birch')];
    const person = await signedIn(house, { roles: ['clinician'], wardIds: [alder] });
    await setWards(person.id, [alder], [alder, birch]);
    const stale = await problemOf(await setWards(person.id, [alder], []));
    expect(stale.code).toBe('stale');
    expect(stale.body.wardIds).toEqual([alder, birch].sort());
  });

  test('that do not exist are refused', async () => {
    const person = await signedIn(house, { roles: ['clinician'] });
    expect((await problemOf(await setWards(person.id, [], ['elsewhere']))).code).toBe('body-invalid');
  });
});

describe('somebody who leaves', () => {
  const leave = (id: string, by = admin) =>
    call(leaveRoute, { body: { reason: 'moved to another hospital' }, params: { id }, cookie: by.cookie });

  test('is out at once, cannot come in again, and stays named', async () => {
    const alder = await addWard(house, 'Alder');
    const person = await signedIn(house, { roles: ['clinician'], wardIds: [alder] });
    expect((await leave(person.id)).status).toBe(200);
    expect((await call(me, { cookie: person.cookie })).status).toBe(401);
    const again = await call(signInRoute, { body: { email: person.email, password: PASSWORD } });
    expect(again.status).toBe(401);
    const shown = await call(personRoute, { params: { id: person.id }, cookie: admin.cookie });
    expect(await shown.json()).toMatchObject({ name: person.name, roles: [], wardIds: [], sessions: [] });
    expect((await entriesOf(house)).find(({ kind }) => kind === 'person-left')).toMatchObject({
      detail: { reason: 'moved to another hospital', sessionsEnded: 1 },
      before: { roles: ['clinician'], wards: ['Alder'] },
    });
  });

  test('is not the one who says so, and not the last IT administrator', async () => {
    expect((await problemOf(await leave(admin.id))).code).toBe('not-possible');
    const other = await signedIn(house, { roles: ['itadmin'] });
    expect((await leave(admin.id, other)).status).toBe(200);
    expect(await rolesOf(other.id)).toEqual(['itadmin']);
  });

  test('cannot be given anything any more', async () => {
    const person = await signedIn(house, { roles: ['clinician'] });
    await leave(person.id);
    expect((await give(admin, person.id, 'auditor')).status).toBe(404);
    expect((await leave(person.id)).status).toBe(404);
  });
});

describe('an administrator', () => {
  test('ends all sessions of somebody', async () => {
    const person = await signedIn(house, { roles: ['clinician'] });
    const answer = await call(endSessionsRoute, {
      method: 'POST',
      params: { id: person.id },
      cookie: admin.cookie,
    });
    expect(await answer.json()).toEqual({ ended: 1 });
    expect((await call(me, { cookie: person.cookie })).status).toBe(401);
    expect(await kindsOf(house)).toEqual(['sessions-ended']);
  });

  test('removes a lost second factor with a reason, and its owner is told', async () => {
    const person = await signedIn(house, { roles: ['clinician'], secondFactor: true });
    await house.services.write(async (tx) => {
      await tx
        .insert(twoFactor)
        .values({ id: newId(), userId: person.id, secret: 'sealed', backupCodes: 'sealed' });
    });
    const remove = (id: string) =>
      call(removeFactorRoute, { body: { reason: 'phone was lost' }, params: { id }, cookie: admin.cookie });
    expect((await remove(person.id)).status).toBe(200);
    expect((await call(me, { cookie: person.cookie })).status).toBe(401);
    expect(await house.services.read.select().from(twoFactor)).toEqual([]);
    expect((await house.deliver()).at(-1)).toMatchObject({ to: person.email });
    expect((await problemOf(await remove(person.id))).code).toBe('not-possible');
    expect((await problemOf(await remove(admin.id))).code).toBe('not-possible');
  });
});
