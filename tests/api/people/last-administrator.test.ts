import { eq } from 'drizzle-orm';
import { afterEach, beforeEach, expect, test } from 'vitest';
import { POST as leaveRoute } from '@/app/api/people/[id]/leave/route';
import { POST as rolesRoute } from '@/app/api/people/[id]/roles/route';
import { personRole } from '@/db/schema';
import { call, problemOf } from '../../support/call';
import { signedIn } from '../../support/people';
import { type House, openHouse } from '../../support/services';

type Admin = Awaited<ReturnType<typeof signedIn>>;
let house: House;
let one: Admin;
let other: Admin;
beforeEach(async () => {
  house = await openHouse();
  one = await signedIn(house, { roles: ['itadmin', 'auditor'] });
  other = await signedIn(house, { roles: ['itadmin', 'auditor'] });
});
afterEach(() => house.close());

const takes = (by: Admin, from: Admin) =>
  call(rolesRoute, { params: { id: from.id }, body: { role: 'itadmin', held: false }, cookie: by.cookie });
const saysLeft = (by: Admin, who: Admin) =>
  call(leaveRoute, { params: { id: who.id }, body: { reason: 'Moved away' }, cookie: by.cookie });
const administrators = () =>
  house.services.read.select().from(personRole).where(eq(personRole.role, 'itadmin'));

test.each<[string, () => Promise<Response>[]]>([
  ['each takes the role from the other', () => [takes(one, other), takes(other, one)]],
  ['each says that the other left', () => [saysLeft(one, other), saysLeft(other, one)]],
  ['one takes the role while the other says that they left', () => [takes(one, other), saysLeft(other, one)]],
  [
    'one gives up their own while it is said that the other left',
    () => [takes(one, one), saysLeft(one, other)],
  ],
])('at the same moment: %s, and one administrator stays', async (_what, both) => {
  const answers = await Promise.all(both());
  expect(answers.filter(({ status }) => status === 200)).toHaveLength(1);
  expect(await administrators()).toHaveLength(1);
});

test('one after the other: the second is told that it is the last', async () => {
  expect((await saysLeft(one, other)).status).toBe(200);
  const { code, body } = await problemOf(await takes(one, one));
  expect([code, String(body.detail).includes('last IT administrator')]).toEqual(['not-possible', true]);
});
