import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { POST as heardRoute } from '@/app/api/recordings/[id]/heard/route';
import { GET as originalRoute } from '@/app/api/recordings/[id]/original/route';
import { GET as peaksRoute } from '@/app/api/recordings/[id]/peaks/route';
import { GET as recordingRoute } from '@/app/api/recordings/[id]/route';
import { GET as soundRoute } from '@/app/api/recordings/[id]/sound/route';
import { GET as spectrogramRoute } from '@/app/api/recordings/[id]/spectrogram/route';
import { noteAccess } from '@/lib/custody/noteAccess';
import {
  type Bedside,
  type Clinician,
  openBedside,
  picturesOf,
  type Recording,
} from '@/tests/support/bedside';
import { call, type Handler, problemOf } from '@/tests/support/call';
import { entriesOf } from '@/tests/support/entries';
import { signedIn } from '@/tests/support/people';

const BYTES = new Uint8Array(Array.from({ length: 4_000 }, (_, i) => i % 251));

let house: Bedside;
let solveig: Clinician;
let elsewhere: Clinician;
let clip: Recording;

beforeEach(async () => {
  house = await openBedside();
  const alder = await house.ward('Alder');
  solveig = await house.clinician([alder]);
  elsewhere = await house.clinician([await house.ward('Birch')]);
  const place = await house.encounter(await house.patient(), { wardId: alder });
  clip = await house.clip({
    device: await house.device({ wardId: alder }),
    scannedIdentifier: place.number,
    bytes: BYTES,
  });
});
afterEach(() => house.close());

const get = (
  route: Handler,
  who: { cookie: string } = solveig,
  path = '/',
  headers: Record<string, string> = {},
) => call(route, { params: { id: clip.number }, cookie: who.cookie, path, headers });
const heard = (more: Record<string, unknown> = {}, who: { cookie: string } = solveig) =>
  call(heardRoute, {
    params: { id: clip.number },
    body: { band: { lowHz: 100, highHz: 1000 }, fromSeconds: 6.1, toSeconds: 8.35, seconds: 12, ...more },
    cookie: who.cookie,
  });
const accesses = async () =>
  (await entriesOf(house)).filter(({ kind }) => ['looked-at', 'heard', 'downloaded'].includes(kind));
const bytesOf = async (answer: Response) => new Uint8Array(await answer.arrayBuffer());

describe('looking', () => {
  test.each([
    ['the recording', recordingRoute],
    ['its peaks', peaksRoute],
    ['its spectrogram', spectrogramRoute],
  ] as const)('at %s is written before it is given', async (_what, route) => {
    await (await get(route)).arrayBuffer();
    expect(await accesses()).toMatchObject([
      { kind: 'looked-at', actor: { id: solveig.id, role: 'clinician' }, detail: { number: clip.number } },
    ]);
  });

  test('for a quarter of an hour is one line, however many pictures are fetched at once', async () => {
    const answers = await Promise.all([get(recordingRoute), get(peaksRoute), get(spectrogramRoute)]);
    await Promise.all(answers.map((answer) => answer.arrayBuffer()));
    house.clock.advance(14 * 60_000);
    await (await get(recordingRoute)).arrayBuffer();
    expect(await accesses()).toHaveLength(1);
    house.clock.advance(2 * 60_000);
    await (await get(recordingRoute)).arrayBuffer();
    expect(await accesses()).toHaveLength(2);
  });

  test('by one person twice at the same instant is one line', async () => {
    const look = () =>
      noteAccess(house.services, 'looked-at', { kind: 'person', id: solveig.id, label: solveig.name }, clip);
    expect((await Promise.all([look(), look(), look()])).filter(Boolean)).toHaveLength(1);
    expect(await accesses()).toHaveLength(1);
  });

  test('by another person is another line', async () => {
    const auditor = await signedIn(house, { roles: ['auditor'] });
    await get(recordingRoute);
    await get(recordingRoute, auditor);
    expect((await accesses()).map((entry) => entry.actor.role)).toEqual(['clinician', 'auditor']);
  });
});

describe('listening', () => {
  test('hands out the original’s bytes unchanged, and is written first', async () => {
    const answer = await get(soundRoute);
    expect(answer.headers.get('content-type')).toBe('audio/wav');
    expect(answer.headers.get('x-content-type-options')).toBe('nosniff');
    expect(await bytesOf(answer)).toEqual(BYTES);
    expect(await accesses()).toMatchObject([{ kind: 'heard', actor: { id: solveig.id } }]);
  });

  test('again within ten minutes is no second line; later it is', async () => {
    await bytesOf(await get(soundRoute));
    house.clock.advance(9 * 60_000);
    await bytesOf(await get(soundRoute));
    expect(await accesses()).toHaveLength(1);
    house.clock.advance(2 * 60_000);
    await bytesOf(await get(soundRoute));
    expect(await accesses()).toHaveLength(2);
  });

  test('through a band to a stretch is told apart, and the same again is not repeated', async () => {
    await bytesOf(await get(soundRoute));
    expect((await heard()).status).toBe(204);
    await heard({ seconds: 3 });
    await heard({ band: null });
    expect((await accesses()).map((entry) => entry.detail)).toEqual([
      { number: clip.number },
      { number: clip.number, band: '100 to 1000 Hz', from: 6.1, to: 8.4, seconds: 12 },
      { number: clip.number, band: 'as recorded', from: 6.1, to: 8.4, seconds: 12 },
    ]);
  });

  test('that a player never tells of stands in the log all the same', async () => {
    await bytesOf(await get(soundRoute));
    expect((await accesses()).map(({ kind }) => kind)).toEqual(['heard']);
  });

  test.each([{ toSeconds: 1 }, { seconds: -1 }, { fromSeconds: Number.MAX_VALUE }, { band: { lowHz: 1 } }])(
    'told as %j is refused',
    async (wrong) => {
      expect((await problemOf(await heard(wrong))).code).toBe('body-invalid');
    },
  );

  test('where the store does not answer is told as that, and the entry stands: it may have been heard', async () => {
    await house.fake.close();
    const answer = await get(soundRoute);
    expect((await problemOf(answer)).code).toBe('storage-unavailable');
    expect(await accesses()).toHaveLength(1);
  });
});

describe('taking the original away', () => {
  test('writes each time, and leads to an address that serves it as an attachment under its number', async () => {
    const answer = await get(originalRoute);
    expect(answer.status).toBe(303);
    expect(answer.headers.get('cache-control')).toBe('no-store');
    const file = await fetch(answer.headers.get('location') ?? '');
    expect(file.headers.get('content-type')).toBe('audio/wav');
    expect(file.headers.get('content-disposition')).toContain(`attachment`);
    expect(file.headers.get('content-disposition')).toContain(`${clip.number}.wav`);
    expect(await bytesOf(file)).toEqual(BYTES);
    await get(originalRoute);
    expect((await accesses()).map(({ kind }) => kind)).toEqual(['downloaded', 'downloaded']);
  });
});

describe('pictures', () => {
  test('asked for under their hash are kept by the browser, and without it are asked for each time', async () => {
    const sha256 = (await picturesOf(house, clip.id)).get('peaks');
    const named = await get(peaksRoute, solveig, `/?v=${sha256}`);
    expect(await bytesOf(named)).toEqual(BYTES);
    expect(named.headers.get('cache-control')).toBe('private, max-age=31536000, immutable');
    expect(named.headers.get('vary')).toBe('cookie');
    const plain = await get(peaksRoute, solveig, '/?v=another');
    expect(plain.headers.get('cache-control')).toBe('private, no-cache');
    const again = await get(peaksRoute, solveig, '/', { 'if-none-match': plain.headers.get('etag') ?? '' });
    expect(again.status).toBe(304);
  });
});

test('who may not see it gets nothing of it, is answered as if there were none, and leaves no line', async () => {
  const without = async (answer: Response) => ({ ...((await answer.json()) as object), requestId: '' });
  const missing = await without(
    await call(recordingRoute, { params: { id: '2222-2222' }, cookie: elsewhere.cookie }),
  );
  for (const route of [recordingRoute, peaksRoute, spectrogramRoute, soundRoute, originalRoute]) {
    const answer = await get(route, elsewhere);
    expect(answer.status).toBe(404);
    expect(await without(answer)).toEqual(missing);
  }
  expect(await without(await heard({}, elsewhere))).toEqual(missing);
  expect(await accesses()).toEqual([]);
});
