import { eq } from 'drizzle-orm';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { GET as listRoute } from '@/app/api/people/route';
import { user } from '@/db/schema';
import { call, problemOf } from '@/tests/support/call';
import { addPerson, addWard, signedIn } from '@/tests/support/people';
import { type House, openHouse } from '@/tests/support/services';

interface Answer {
  rows: { id: string; name: string; roles: string[]; wards: string[] }[];
  next: string | null;
  counts: { here: number; left: number; byRole: Record<string, number>; withoutSecondFactor: number };
}

let house: House;
let cookie: string;
beforeEach(async () => {
  house = await openHouse();
  ({ cookie } = await signedIn(house, { roles: ['itadmin'], name: 'Tomasz Abara' }));
});
afterEach(() => house.close());

const list = async (query = '') => {
  const answer = await call(listRoute, { path: `/api/people${query}`, cookie });
  expect(answer.status).toBe(200);
  return (await answer.json()) as Answer;
};
const names = ({ rows }: Answer) => rows.map(({ name }) => name);

describe('people', () => {
  test('are listed by name with roles and wards', async () => {
    const wardIds = [await addWard(house, 'Rowan'), await addWard(house, 'Alder')];
    await addPerson(house, { name: 'Imelda Croft', roles: ['clinician', 'auditor'], wardIds });
    const { rows } = await list();
    expect(rows).toMatchObject([
      { name: 'Imelda Croft', roles: ['clinician', 'auditor'], wards: ['Alder', 'Rowan'] },
      { name: 'Tomasz Abara', roles: ['itadmin'], wards: [] },
    ]);
  });

  test('come page by page without a gap or a repeat, even where names are the same', async () => {
    for (let i = 0; i < 7; i++) await addPerson(house, { name: 'Sam Ito', roles: ['clinician'] });
    const seen: string[] = [];
    let after = '';
    do {
      const page = await list(`?limit=3${after}`);
      seen.push(...page.rows.map(({ id }) => id));
      after = page.next ? `&after=${page.next}` : '';
    } while (after);
    expect(seen).toHaveLength(8);
    expect(new Set(seen).size).toBe(8);
  });

  test('are found by a part of name or address, and signs of patterns are only signs', async () => {
    await addPerson(house, { name: 'Ngata 100%', roles: ['clinician'] });
    await addPerson(house, { name: 'Ngata 1000', roles: ['clinician'] });
    expect(names(await list('?q=gata'))).toEqual(['Ngata 100%', 'Ngata 1000']);
    expect(names(await list(`?q=${encodeURIComponent('0%')}`))).toEqual(['Ngata 100%']);
    expect(names(await list('?q=_'))).toEqual([]);
    expect(names(await list(`?q=${encodeURIComponent("' or 1=1 --")}`))).toEqual([]);
  });

  test('are filtered by role, and those who left stand apart', async () => {
    const gone = await addPerson(house, { name: 'Gone', roles: ['auditor'] });
    await addPerson(house, { name: 'Here', roles: ['auditor'] });
    await house.services.write(async (tx) => {
      await tx.update(user).set({ leftAt: 1 }).where(eq(user.id, gone.id));
    });
    expect(names(await list('?role=auditor'))).toEqual(['Here']);
    expect(names(await list('?left=yes'))).toEqual(['Gone']);
  });

  test('are counted, with the administrators who lack a second factor', async () => {
    await addPerson(house, { roles: ['itadmin'], secondFactor: false });
    await addPerson(house, { roles: ['clinician'] });
    expect((await list()).counts).toEqual({
      here: 3,
      left: 0,
      byRole: { biomed: 0, clinician: 1, itadmin: 2, auditor: 0 },
      withoutSecondFactor: 1,
    });
  });

  test('a filter that is none is refused and names its parameter', async () => {
    const refused = await problemOf(await call(listRoute, { path: '/api/people?role=root', cookie }));
    expect(refused.body).toMatchObject({ errors: [{ path: 'role' }] });
  });
});
