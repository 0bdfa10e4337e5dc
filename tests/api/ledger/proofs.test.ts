import { afterAll, beforeAll, expect, test } from 'vitest';
import { GET as keysRoute } from '@/app/.well-known/custody-keys.txt/route';
import { GET as lockedRoute } from '@/app/api/ledger/heads/[size]/locked/route';
import { GET as headsRoute } from '@/app/api/ledger/heads/route';
import { GET as consistencyRoute } from '@/app/api/ledger/proofs/consistency/route';
import { GET as inclusionRoute } from '@/app/api/ledger/proofs/inclusion/route';
import { appendEntries } from '@/lib/custody/append';
import { SERVICE_ACTOR } from '@/lib/custody/entry';
import { hashOfHex } from '@/lib/custody/pure/checkThread';
import { verifyHead } from '@/lib/custody/pure/head';
import { parseVerifier } from '@/lib/custody/pure/note';
import { verifyConsistency, verifyInclusion } from '@/lib/custody/pure/proofs';
import { headWork, tendHeads } from '@/lib/http/treeHeads';
import { runOutboxOnce } from '@/lib/platform/outbox';
import { call, problemOf } from '@/tests/support/call';
import { signedIn } from '@/tests/support/people';
import { type House, openHouse } from '@/tests/support/services';

let house: House;
let cookie: string;
const append = (count: number) =>
  house.services.write((tx) =>
    appendEntries(
      tx,
      house.clock.now(),
      Array.from({ length: count }, () => ({
        kind: 'log-opened' as const,
        actor: SERVICE_ACTOR,
        subjects: [],
      })),
    ),
  );
beforeAll(async () => {
  house = await openHouse({ storage: true });
  ({ cookie } = await signedIn(house, { roles: ['auditor'] }));
  for (const count of [3, 4, 6]) {
    await append(count);
    await tendHeads(house.services);
  }
  await append(2);
});
afterAll(() => house.close());

interface Heads {
  origin: string;
  rows: { size: number; note: string }[];
  next: number | null;
}
const heads = async (query = ''): Promise<Heads> =>
  (await (await call(headsRoute, { path: `/api/ledger/heads${query}`, cookie })).json()) as Heads;

test('heads and proofs over the routes verify with the published key and nothing else', async () => {
  const keys = await keysRoute();
  const trusted = await Promise.all((await keys.text()).trim().split('\n').map(parseVerifier));
  const { origin, rows } = await heads();
  const all = await Promise.all(rows.map(({ note }) => verifyHead(note, origin, trusted)));
  const [newest, , oldest] = all;
  if (!newest || !oldest) throw new Error('three heads were made');
  const inclusion = (await (
    await call(inclusionRoute, {
      path: `/api/ledger/proofs/inclusion?sequence=0,5,${newest.size - 1}&size=${newest.size}`,
      cookie,
    })
  ).json()) as { proofs: { sequence: number; treeSize: number; leafHash: string; path: string[] }[] };
  expect(inclusion.proofs.map(({ sequence }) => sequence)).toEqual([0, 5, newest.size - 1]);
  for (const { sequence, leafHash, path, treeSize } of inclusion.proofs)
    await verifyInclusion(hashOfHex(leafHash), sequence, treeSize, path.map(hashOfHex), newest.root);
  const { path } = (await (
    await call(consistencyRoute, {
      path: `/api/ledger/proofs/consistency?from=${oldest.size}&to=${newest.size}`,
      cookie,
    })
  ).json()) as { path: string[] };
  await verifyConsistency(oldest.size, newest.size, path.map(hashOfHex), oldest.root, newest.root);
});

test('heads are paged without losing or repeating one', async () => {
  const whole = (await heads()).rows.map(({ size }) => size);
  const first = await heads('?limit=2');
  const second = await heads(`?limit=2&before=${first.next}`);
  expect([...first.rows, ...second.rows].map(({ size }) => size)).toEqual(whole);
  expect(second.next).toBeNull();
});

test('the locked copy is given as storage keeps it, and is not there before it is stored', async () => {
  const [newest] = (await heads()).rows;
  const ask = () => call(lockedRoute, { params: { size: String(newest?.size) }, cookie });
  expect((await ask()).status).toBe(404);
  await runOutboxOnce(house.services, { mail: async () => undefined, ...headWork(house.services) });
  expect(await (await ask()).json()).toMatchObject({ note: newest?.note });
});

test('what the log does not reach, and what makes no sense, is refused', async () => {
  const inclusion = async (query: string) => {
    const answer = await call(inclusionRoute, { path: `/api/ledger/proofs/inclusion?${query}`, cookie });
    return `${answer.status} ${(await problemOf(answer)).code}`;
  };
  expect(await inclusion('sequence=9999&size=10000')).toBe('404 not-found');
  expect(await inclusion('sequence=5&size=5')).toBe('404 not-found');
  expect(await inclusion('sequence=-1&size=5')).toBe('400 body-invalid');
  expect(await inclusion('sequence=1&size=5&more=1')).toBe('400 body-invalid');
  expect(await inclusion(`sequence=${Array(201).fill(1).join()}&size=5`)).toBe('400 body-invalid');
  const consistency = await call(consistencyRoute, {
    path: '/api/ledger/proofs/consistency?from=5&to=4',
    cookie,
  });
  expect(consistency.status).toBe(404);
});
