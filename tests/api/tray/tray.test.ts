import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { POST as fileRoute } from '@/app/api/recordings/[id]/file/route';
import { GET as trayRoute } from '@/app/api/tray/route';
import {
  type Bedside,
  type Clinician,
  type Device,
  type Encounter,
  openBedside,
  type Patient,
  type Recording,
  wristbandOf,
} from '@/tests/support/bedside';
import { call, problemOf } from '@/tests/support/call';
import { kindsOf } from '@/tests/support/entries';

let house: Bedside;
let solveig: Clinician;
let elsewhere: Clinician;
let device: Device;
let freya: Patient;
let place: Encounter;

beforeEach(async () => {
  house = await openBedside();
  const alder = await house.ward('Alder');
  solveig = await house.clinician([alder], { name: 'Dr Solveig Adeyemi' });
  elsewhere = await house.clinician([await house.ward('Birch')]);
  device = await house.device({ wardId: alder });
  freya = await house.patient();
  place = await house.encounter(freya, { wardId: alder });
});
afterEach(() => house.close());

const tray = async (who = solveig) =>
  (await (await call(trayRoute, { path: '/api/tray', cookie: who.cookie })).json()) as {
    rows: { number: string; candidates: { encounterId: string }[] }[];
  };
const file = (clip: Recording, who = solveig, more: Record<string, unknown> = {}, key = '') =>
  call(fileRoute, {
    params: { id: clip.number },
    body: { encounterId: place.id, identifiers: wristbandOf(freya), ...more },
    cookie: who.cookie,
    headers: { 'idempotency-key': key },
  });

test('a stray clip is filed to its suggested encounter and leaves the tray', async () => {
  const clip = await house.clip({ device });
  const [row] = (await tray()).rows;
  const answer = await file(clip, solveig, { encounterId: row?.candidates[0]?.encounterId });
  expect(await answer.json()).toEqual({ recording: clip.number, encounter: place.number });
  expect((await tray()).rows).toEqual([]);
});

test('a filing whose answer was lost is answered again as it was, and done once', async () => {
  const clip = await house.clip({ device });
  const first = await file(clip, solveig, {}, 'the-same-press');
  const again = await file(clip, solveig, {}, 'the-same-press');
  expect(again.status).toBe(200);
  expect(again.headers.get('idempotency-replayed')).toBe('true');
  expect(await again.json()).toEqual(await first.json());
  expect((await kindsOf(house)).filter((kind) => kind === 'filed')).toHaveLength(1);
});

test('a filing pressed twice at once is done once, and both presses are answered alike', async () => {
  const clip = await house.clip({ device });
  const answers = await Promise.all([
    file(clip, solveig, {}, 'same-press'),
    file(clip, solveig, {}, 'same-press'),
  ]);
  const bodies = await Promise.all(answers.map((answer) => answer.json()));
  expect(bodies[0]).toEqual(bodies[1]);
  expect(await house.filings(clip.id)).toHaveLength(1);
});

test('who comes second is told who was first', async () => {
  const clip = await house.clip({ device });
  await file(clip);
  const other = await house.clinician(solveig.wardIds);
  const answer = await file(clip, other);
  expect(answer.status).toBe(409);
  const { code, body } = await problemOf(answer);
  expect(code).toBe('already-filed');
  expect(body).toMatchObject({ by: 'Dr Solveig Adeyemi', at: expect.any(Number), encounter: place.number });
});

test('two identifiers are needed, and the wrong ones are told so without saying whose they are', async () => {
  const clip = await house.clip({ device });
  const { code: missing } = await problemOf(
    await file(clip, solveig, { identifiers: { recordNumber: freya.recordNumber } }),
  );
  expect(missing).toBe('body-invalid');
  const wrong = await file(clip, solveig, { identifiers: { ...wristbandOf(freya), second: 'Thackeray' } });
  expect(wrong.status).toBe(422);
  const { code, body } = await problemOf(wrong);
  expect(code).toBe('identifiers-mismatch');
  expect(JSON.stringify(body)).not.toContain('Ashgrove');
});

describe('somebody of another ward', () => {
  test('has another tray, and cannot file from this one', async () => {
    const clip = await house.clip({ device });
    expect((await tray(elsewhere)).rows).toEqual([]);
    const without = async (answer: Response) => ({ ...((await answer.json()) as object), requestId: '' });
    const missing = await without(await file({ ...clip, number: '2222-2222' }, elsewhere));
    expect(await without(await file(clip, elsewhere))).toEqual(missing);
    expect(await house.filings(clip.id)).toEqual([]);
  });

  test('cannot be filed to: a clip goes to no patient that one may not see', async () => {
    const outsider = await house.patient();
    const outside = await house.encounter(outsider, { wardId: elsewhere.wardIds[0] ?? null });
    const clip = await house.clip({ device });
    const answer = await file(clip, solveig, {
      encounterId: outside.id,
      identifiers: wristbandOf(outsider),
    });
    expect((await problemOf(answer)).code).toBe('not-found');
    expect(await house.filings(clip.id)).toEqual([]);
  });
});
