import { afterEach, beforeEach, expect, test } from 'vitest';
import { GET as eventsRoute } from '@/app/api/events/route';
import { giveRole } from '@/lib/identity/giveRole';
import { takeRole } from '@/lib/identity/takeRole';
import { call } from '@/tests/support/call';
import { authorityOf, signedIn, type TestPerson } from '@/tests/support/people';
import { type House, openHouse } from '@/tests/support/services';

let house: House;
let admin: TestPerson;
beforeEach(async () => {
  house = await openHouse();
  admin = await signedIn(house, { roles: ['itadmin'] });
});
afterEach(() => house.close());

/** Everything that a stream says until it ends by itself. */
async function untilItEnds(answer: Response): Promise<string> {
  let said = '';
  for await (const chunk of answer.body ?? []) said += Buffer.from(chunk).toString();
  return said;
}

test('a stream of somebody whose role is taken ends, and says nothing of it', async () => {
  const person = await signedIn(house, { roles: ['itadmin', 'auditor'] });
  const answer = await call(eventsRoute, { path: '/api/events', cookie: person.cookie });
  await takeRole(house.services, authorityOf<'people.write'>(admin), person.id, 'itadmin');
  expect(await untilItEnds(answer)).not.toContain('role-taken');
  expect((await call(eventsRoute, { path: '/api/events', cookie: person.cookie })).status).toBe(401);
});

test('a stream of somebody else hears only of what that person may see', async () => {
  const other = await signedIn(house, { roles: ['auditor'] });
  const clinician = await signedIn(house, { roles: ['clinician'] });
  const streams = [other, clinician].map(({ cookie }) => call(eventsRoute, { path: '/api/events', cookie }));
  const [auditorStream, clinicianStream] = await Promise.all(streams);
  const by = authorityOf<'people.write'>(admin);
  const somebody = await signedIn(house, { roles: ['biomed'] });
  await giveRole(house.services, by, somebody.id, 'auditor');
  // Each stream ends with the change of its own person, which comes last.
  await giveRole(house.services, by, other.id, 'biomed');
  await giveRole(house.services, by, clinician.id, 'biomed');
  expect(await untilItEnds(auditorStream as Response)).toContain(somebody.id);
  expect(await untilItEnds(clinicianStream as Response)).not.toContain(somebody.id);
});
