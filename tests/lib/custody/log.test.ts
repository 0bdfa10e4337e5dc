import { readFileSync } from 'node:fs';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { appendEntries } from '@/lib/custody/append';
import { canonicalEntry, type NewEntry, SERVICE_ACTOR } from '@/lib/custody/entry';
import { LedgerSearch, ledgerQuery, startOfDay } from '@/lib/custody/ledgerSearch';
import { noteAccess } from '@/lib/custody/noteAccess';
import { checkLeaves } from '@/lib/custody/pure/checkLeaves';
import { emptyRoot, hex, leafHash, nodeHash } from '@/lib/custody/pure/hash';
import { logSize, readLedger, readThread } from '@/lib/custody/readThread';
import { type House, openHouse } from '../../support/services';

let house: House;
beforeAll(async () => {
  house = await openHouse();
});
afterAll(() => house.close());

const entry = (id: string, more: Partial<NewEntry> = {}): NewEntry => ({
  kind: 'heard',
  actor: { kind: 'person', id: 'p', label: 'Dr P', role: 'clinician' },
  subjects: [{ kind: 'recording', id }],
  ...more,
});
const append = (...entries: NewEntry[]) =>
  house.services.write((tx) => appendEntries(tx, house.services.clock.now(), entries));

// RFC 6962, 2.1, on the leaves of the certificate-transparency reference tests.
test('leaf and node hashes are those of RFC 6962', async () => {
  const vectors = JSON.parse(readFileSync('tests/reference/merkle/ct-reference-8-leaves.json', 'utf8')) as {
    emptyRoot: string;
    leavesHex: string[];
    leafHashes: string[];
    roots: string[];
  };
  const leaves = await Promise.all(vectors.leavesHex.map((leaf) => leafHash(Buffer.from(leaf, 'hex'))));
  expect(leaves.map(hex)).toEqual(vectors.leafHashes);
  expect(hex(await emptyRoot())).toBe(vectors.emptyRoot);
  const [a, b, c, d] = leaves as [Uint8Array, Uint8Array, Uint8Array, Uint8Array];
  expect(hex(await nodeHash(a, b))).toBe(vectors.roots[1]);
  expect(hex(await nodeHash(await nodeHash(a, b), await nodeHash(c, d)))).toBe(vectors.roots[3]);
});

// RFC 8785, 3.2.3: members sorted by UTF-16 code units; 3.2.2.3: numbers as ECMAScript writes them.
test('an entry is canonical JSON: members sorted, no space, undefined left out', () => {
  const text = canonicalEntry({
    sequence: 3,
    at: '2026-12-01T10:00:00.000Z',
    ...entry('r'),
    detail: { b: 1e21, a: '€', gone: undefined },
  });
  expect(text).toBe(
    '{"actor":{"id":"p","kind":"person","label":"Dr P","role":"clinician"},"at":"2026-12-01T10:00:00.000Z","detail":{"a":"€","b":1e+21},"kind":"heard","sequence":3,"subjects":[{"id":"r","kind":"recording"}],"version":1}',
  );
});

test('sequence numbers are dense from zero, whoever appends at once', async () => {
  const before = await logSize(house.services);
  const last = await Promise.all(
    Array.from({ length: 20 }, (_, i) => append(entry(`r${i}`), entry(`r${i}`))),
  );
  expect([...last].sort((a, b) => a - b)).toEqual(Array.from({ length: 20 }, (_, i) => before + 2 * i + 1));
  expect(await logSize(house.services)).toBe(before + 40);
});

test('an append whose transaction fails leaves no trace and no gap', async () => {
  const before = await logSize(house.services);
  await expect(
    house.services.write(async (tx) => {
      await appendEntries(tx, 1, [entry('lost')]);
      throw new Error('no');
    }),
  ).rejects.toThrow('no');
  expect(await logSize(house.services)).toBe(before);
  expect((await readThread(house.services, { kind: 'recording', id: 'lost' })).rows).toEqual([]);
});

test('a thread is paged without losing or repeating an entry', async () => {
  for (let i = 0; i < 7; i++) await append(entry('paged', { detail: { i } }));
  const seen: number[] = [];
  let before: number | undefined;
  do {
    const page = await readThread(house.services, { kind: 'recording', id: 'paged' }, { limit: 3, before });
    seen.push(...page.rows.map((row) => Number(row.entry.detail?.i)));
    before = page.next ?? undefined;
  } while (before !== undefined);
  expect(seen).toEqual([6, 5, 4, 3, 2, 1, 0]);
});

test('the ledger is filtered by kind, actor, subject and day', async () => {
  await append(entry('filtered', { kind: 'sealed', actor: SERVICE_ACTOR }));
  const find = async (query: Parameters<typeof readLedger>[1]) =>
    (await readLedger(house.services, query)).rows.length;
  expect(await find({ kinds: ['sealed'], subjects: [{ kind: 'recording', id: 'filtered' }] })).toBe(1);
  expect(await find({ subjects: [] })).toBe(0);
  expect(await find({ actor: { kind: 'service', id: 'bellkeep' }, kinds: ['heard'] })).toBe(0);
  expect(await find({ toMs: 0 })).toBe(0);
});

test('one look is one entry: looking again within a quarter of an hour is not written, hearing is', async () => {
  const actor = { kind: 'person' as const, id: 'looker', label: 'L' };
  for (let i = 0; i < 3; i++)
    await noteAccess(house.services, 'looked-at', actor, { id: 'looked', number: 'N' });
  await noteAccess(house.services, 'heard', actor, { id: 'looked', number: 'N' });
  house.clock.advance(16 * 60_000);
  await noteAccess(house.services, 'looked-at', actor, { id: 'looked', number: 'N' });
  expect(
    (await readThread(house.services, { kind: 'recording', id: 'looked' })).rows.map((row) => row.kind),
  ).toEqual(['looked-at', 'heard', 'looked-at']);
});

test('a changed byte of an entry is seen by the check in the browser', async () => {
  await append(entry('checked'));
  const [row] = (await readThread(house.services, { kind: 'recording', id: 'checked' })).rows;
  if (!row) throw new Error('no entry');
  const [right] = await checkLeaves([row]);
  const [wrong] = await checkLeaves([{ ...row, canonical: row.canonical.replace('Dr P', 'Dr Q') }]);
  expect([right?.right, wrong?.right]).toEqual([true, false]);
});

test('a day of the ledger is the hospital’s day, also on nights when clocks change', () => {
  const zone = 'Europe/London';
  // 29 March 2026 has 23 hours in London, 25 October 2026 has 25 (IANA time zone database).
  expect(startOfDay('2026-03-30', zone) - startOfDay('2026-03-29', zone)).toBe(23 * 3_600_000);
  expect(startOfDay('2026-10-26', zone) - startOfDay('2026-10-25', zone)).toBe(25 * 3_600_000);
  const query = ledgerQuery(LedgerSearch.parse({ day: '2026-07-01' }), zone, 0);
  expect(query).toMatchObject({
    fromMs: Date.parse('2026-06-30T23:00:00Z'),
    toMs: Date.parse('2026-07-01T23:00:00Z'),
  });
});

test('an address of the ledger that makes no sense opens the whole ledger', () => {
  expect(LedgerSearch.parse({ kind: 'nonsense', day: 'someday', before: 'x', q: ['a', 'b'] })).toEqual({
    q: 'a',
  });
});
