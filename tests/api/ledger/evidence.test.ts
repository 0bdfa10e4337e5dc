import { mkdtemp, readFile, rm, writeFile } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { eq } from 'drizzle-orm';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { POST as decideRoute } from '@/app/api/ledger/evidence/[id]/decide/route';
import { GET as takeRoute } from '@/app/api/ledger/evidence/[id]/route';
import { POST as askRoute } from '@/app/api/ledger/recordings/[number]/evidence/route';
import { GET as originalRoute } from '@/app/api/ledger/recordings/[number]/original/route';
import { custodyEntry, evidencePolicy, recording } from '@/db/schema';
import { sendRecording } from '@/devices/agent/upload';
import { listEvidence } from '@/lib/custody/evidence/listEvidence';
import { call, problemOf } from '@/tests/support/call';
import { run, unpack } from '@/tests/support/packages';
import { chestWav, clipOf, openPassageHouse, type PassageHouse } from '@/tests/support/passageHouse';
import { signedIn, type TestPerson } from '@/tests/support/people';

type SignedIn = TestPerson & { cookie: string };
let house: PassageHouse;
let first: SignedIn;
let second: SignedIn;
let number: string;
let place: string;
const bytes = chestWav();

beforeAll(async () => {
  place = await mkdtemp(join(tmpdir(), 'bellkeep-evidence-'));
  house = await openPassageHouse();
  first = await signedIn(house, { roles: ['auditor'] });
  second = await signedIn(house, { roles: ['auditor'] });
  const { agent } = await house.enrolled();
  ({
    answer: { recording: number },
  } = await sendRecording(agent, clipOf(bytes)));
});
afterAll(async () => {
  await house.close();
  await rm(place, { recursive: true });
});

const origin = () => ({ origin: house.origin });
const ask = (person: SignedIn, body: unknown = { reason: 'for the coroner' }, headers = {}) =>
  call(askRoute, { body, params: { number }, cookie: person.cookie, headers: { ...origin(), ...headers } });
const take = (person: SignedIn, id: string) => call(takeRoute, { params: { id }, cookie: person.cookie });
const decide = (person: SignedIn, id: string, approve: boolean) =>
  call(decideRoute, { body: { approve }, params: { id }, cookie: person.cookie, headers: origin() });
const asked = async (person: SignedIn) => (await (await ask(person)).json()) as { id: string; state: string };
const refusal = async (answer: Response) => `${answer.status} ${(await problemOf(answer)).code}`;
const countOf = async (kind: string) =>
  (await house.services.read.select().from(custodyEntry).where(eq(custodyEntry.kind, kind))).length;
const secondPerson = async (on: boolean) => {
  const version = (await house.services.read.select().from(evidencePolicy)).length + 1;
  await house.services.write(async (tx) => {
    await tx
      .insert(evidencePolicy)
      .values({ version, secondPerson: on, madeBy: first.id, madeAt: house.clock.now() });
  });
};

test('a package is asked for with a reason and taken away by who asked; each time is an entry', async () => {
  const { id, state } = await asked(first);
  expect(state).toBe('open');
  const answer = await take(first, id);
  expect(answer.headers.get('content-disposition')).toBe(`attachment; filename="evidence-${number}.zip"`);
  const archive = join(place, 'package.zip');
  await writeFile(archive, Buffer.from(await answer.arrayBuffer()));
  await unpack(await readFile(archive), place);
  const verifier = join(place, `evidence-${number}`, 'verify.mjs');
  const { code, output } = await run(process.execPath, [verifier, archive], place);
  expect(code, output).toBe(0);
  await (await take(first, id)).arrayBuffer();
  expect(await countOf('exported')).toBe(2);
  expect(await refusal(await take(second, id))).toBe('404 not-found');
});

test('without a reason, and of a recording that is not there, nothing is asked', async () => {
  const before = await countOf('evidence-asked');
  expect(await refusal(await ask(first, { reason: ' no ' }))).toBe('400 body-invalid');
  const missing = await call(askRoute, {
    body: { reason: 'for the coroner' },
    params: { number: 'NOTT-HERE' },
    cookie: first.cookie,
    headers: origin(),
  });
  expect(await refusal(missing)).toBe('404 not-found');
  expect(await countOf('evidence-asked')).toBe(before);
});

test('the same press twice is one request', async () => {
  const before = await countOf('evidence-asked');
  const key = { 'idempotency-key': 'press-0001' };
  const answers = await Promise.all([ask(first, undefined, key), ask(first, undefined, key)]);
  const ids = await Promise.all(answers.map(async (answer) => ((await answer.json()) as { id: string }).id));
  expect(new Set(ids).size).toBe(1);
  expect(await countOf('evidence-asked')).toBe(before + 1);
});

test('where policy says so a second person decides, once, and not the one who asked', async () => {
  await secondPerson(true);
  const { id, state } = await asked(first);
  expect(state).toBe('waiting');
  expect(await refusal(await take(first, id))).toBe('409 not-possible');
  expect(await refusal(await decide(first, id, true))).toBe('409 not-possible');
  const both = await Promise.all([decide(second, id, true), decide(second, id, false)]);
  expect(both.map(({ status }) => status).sort()).toEqual([200, 409]);
  const other = await asked(second);
  expect((await decide(first, other.id, false)).status).toBe(200);
  expect(await refusal(await take(second, other.id))).toBe('409 not-possible');
  expect(await countOf('evidence-decided')).toBe(2);
  const [row] = await house.services.read.select().from(recording);
  const lines = await listEvidence(house.services, row?.id ?? '');
  expect(lines.find((line) => line.id === other.id)).toMatchObject({ decision: 'refused' });
  await secondPerson(false);
});

test('the original is handed to be hashed, byte for byte, and the entry says why', async () => {
  const answer = await call(originalRoute, { params: { number }, cookie: first.cookie });
  expect(Buffer.from(await answer.arrayBuffer()).equals(Buffer.from(bytes))).toBe(true);
  const [entry] = await house.services.read
    .select()
    .from(custodyEntry)
    .where(eq(custodyEntry.kind, 'downloaded'));
  expect(JSON.parse(entry?.canonical ?? '{}')).toMatchObject({ detail: { why: 'verification', number } });
});

test('a package without its original is refused, and no entry says that it was made', async () => {
  const { id } = await asked(first);
  const before = await countOf('exported');
  const [row] = await house.services.read.select().from(recording);
  await house.fake.backdoor.remove('bellkeep', row?.originalKey ?? '');
  expect(await refusal(await take(first, id))).toBe('409 not-possible');
  expect(await countOf('exported')).toBe(before);
});
