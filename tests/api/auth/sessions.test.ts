import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { POST as endRoute } from '@/app/api/account/sessions/end/route';
import { GET as sessionsRoute } from '@/app/api/account/sessions/route';
import { GET as me } from '@/app/api/me/route';
import { session } from '@/db/schema';
import { forgetExpired } from '@/lib/identity/forgetExpired';
import { call } from '@/tests/support/call';
import { entriesOf } from '@/tests/support/entries';
import { sessionOf, signedIn } from '@/tests/support/people';
import { type House, openHouse } from '@/tests/support/services';

let house: House;
beforeEach(async () => {
  house = await openHouse();
});
afterEach(() => house.close());

interface Sessions {
  sessions: { id: string }[];
  current: string;
}
const list = async (cookie: string) => (await (await call(sessionsRoute, { cookie })).json()) as Sessions;

describe('one’s own sessions', () => {
  test('are listed without their tokens, with the one in use told apart', async () => {
    const person = await signedIn(house, { roles: ['auditor'] });
    await sessionOf(house, person);
    const { sessions, current } = await list(person.cookie);
    expect(sessions).toHaveLength(2);
    expect(sessions.map(({ id }) => id)).toContain(current);
    const tokens = (await house.services.read.select().from(session)).map(({ token }) => token);
    for (const token of tokens) expect(JSON.stringify(sessions)).not.toContain(token);
  });

  test('one of them can be ended', async () => {
    const person = await signedIn(house, { roles: ['auditor'] });
    const other = await sessionOf(house, person);
    const { current } = await list(other);
    const answer = await call(endRoute, { body: { id: current }, cookie: person.cookie });
    expect(await answer.json()).toEqual({ ended: 1 });
    expect((await call(me, { cookie: other })).status).toBe(401);
    expect((await call(me, { cookie: person.cookie })).status).toBe(200);
    expect((await entriesOf(house)).at(-1)).toMatchObject({ kind: 'sessions-ended', detail: { count: 1 } });
  });

  test('all others can be ended at once', async () => {
    const person = await signedIn(house, { roles: ['auditor'] });
    const others = [await sessionOf(house, person), await sessionOf(house, person)];
    await call(endRoute, { body: { others: true }, cookie: person.cookie });
    for (const cookie of others) expect((await call(me, { cookie })).status).toBe(401);
    expect((await call(me, { cookie: person.cookie })).status).toBe(200);
  });

  test('somebody else’s cannot be ended, and answers like one that is not there', async () => {
    const person = await signedIn(house, { roles: ['auditor'] });
    const other = await signedIn(house, { roles: ['auditor'] });
    const { current } = await list(other.cookie);
    const theirs = await call(endRoute, { body: { id: current }, cookie: person.cookie });
    const nobodys = await call(endRoute, { body: { id: 'not-there' }, cookie: person.cookie });
    const without = async (answer: Response) => ({ ...((await answer.json()) as object), requestId: '' });
    expect(await without(theirs)).toEqual(await without(nobodys));
    expect(theirs.status).toBe(404);
    expect((await call(me, { cookie: other.cookie })).status).toBe(200);
  });

  test('ended ones are removed by and by, living ones stay', async () => {
    const person = await signedIn(house, { roles: ['auditor'] });
    await forgetExpired(house.services);
    expect((await call(me, { cookie: person.cookie })).status).toBe(200);
    house.clock.advance(13 * 3_600_000);
    await forgetExpired(house.services);
    expect(await house.services.read.select().from(session)).toEqual([]);
  });
});
