import { eq } from 'drizzle-orm';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { recording } from '@/db/schema';
import { fileFromTray } from '@/lib/filing/fileFromTray';
import { keepAnyway } from '@/lib/filing/keepAnyway';
import { moveFiling } from '@/lib/filing/moveFiling';
import { openSession } from '@/lib/filing/openSession';
import { Refusal } from '@/lib/platform/errors';
import {
  type Bedside,
  bedsideAuthority,
  type Clinician,
  type Device,
  type Encounter,
  openBedside,
  type Patient,
  type Recording,
  wristbandOf,
} from '@/tests/support/bedside';
import { entriesOf, kindsOf } from '@/tests/support/entries';

let house: Bedside;
let solveig: Clinician;
let pascal: Clinician;
let device: Device;
let freya: Patient;
let emeka: Patient;
let toFreya: Encounter;
let toEmeka: Encounter;

beforeEach(async () => {
  house = await openBedside();
  const alder = await house.ward('Alder');
  solveig = await house.clinician([alder], { name: 'Dr Solveig Adeyemi' });
  pascal = await house.clinician([alder], { name: 'Dr Pascal Ngata' });
  device = await house.device({ wardId: alder });
  freya = await house.patient();
  emeka = await house.patient({ familyName: 'Thackeray', givenName: 'Emeka', birthDate: '2009-04-18' });
  toFreya = await house.encounter(freya, { wardId: alder });
  toEmeka = await house.encounter(emeka, { wardId: alder });
});
afterEach(() => house.close());

const file = (
  who: Clinician,
  clip: Recording,
  to: Encounter,
  identifiers: { recordNumber: string; second: string },
) => fileFromTray(house.services, bedsideAuthority(who), clip.number, { encounterId: to.id, identifiers });
const move = async (
  who: Clinician,
  clip: Recording,
  to: Encounter,
  more: Partial<Parameters<typeof moveFiling>[3]> = {},
) =>
  moveFiling(house.services, bedsideAuthority(who), clip.number, {
    encounterId: to.id,
    identifiers: wristbandOf(to === toFreya ? freya : emeka),
    reason: 'Recorded at the wrong bed',
    version: (await house.recording(clip.id)).version,
    ...more,
  });
const refusal = async (promise: Promise<unknown>): Promise<Refusal> => {
  const error = await promise.then(
    () => null,
    (caught: unknown) => caught,
  );
  if (error instanceof Refusal) return error;
  throw error ?? new Error('it was not refused');
};

describe('filing from the tray', () => {
  test('links the clip, tells the log, and ends its passage, all at once', async () => {
    const clip = await house.clip({ device });
    await file(solveig, clip, toFreya, wristbandOf(freya));
    expect(await house.recording(clip.id)).toMatchObject({
      stage: 'filed',
      filedAt: expect.any(Number),
      version: clip.version + 1,
    });
    expect(await house.filings(clip.id)).toMatchObject([
      { encounterId: toFreya.id, patientId: freya.id, by: 'person', personId: solveig.id, sessionId: null },
    ]);
    expect((await entriesOf(house)).at(-1)).toMatchObject({
      kind: 'filed',
      actor: { id: solveig.id },
      subjects: [
        { kind: 'recording', id: clip.id },
        { kind: 'encounter', id: toFreya.id },
        { kind: 'patient', id: freya.id },
        { kind: 'device', id: device.id },
      ],
      detail: { number: clip.number, encounter: toFreya.number, by: 'person', identifiers: 2 },
    });
  });

  test('a clip filed twice at the same moment is filed once, and the second person is told who was first', async () => {
    const clip = await house.clip({ device });
    const results = await Promise.allSettled([
      file(solveig, clip, toFreya, wristbandOf(freya)),
      file(pascal, clip, toEmeka, wristbandOf(emeka)),
    ]);
    const [filed, ...others] = await house.filings(clip.id);
    expect(others).toEqual([]);
    const loser = results.find((result) => result.status === 'rejected');
    const first = filed?.personId === solveig.id ? solveig : pascal;
    expect(loser?.reason).toMatchObject({
      code: 'already-filed',
      extra: {
        by: first.name,
        at: filed?.filedAt,
        encounter: first === solveig ? toFreya.number : toEmeka.number,
      },
    });
    expect((await kindsOf(house)).filter((kind) => kind === 'filed')).toHaveLength(1);
  });

  test('of a clip that its session filed says so', async () => {
    await openSession(house.services, bedsideAuthority(solveig), {
      encounterId: toFreya.id,
      device: device.assetTag,
      takeOver: false,
    });
    const clip = await house.clip({ device });
    expect(await refusal(file(pascal, clip, toEmeka, wristbandOf(emeka)))).toMatchObject({
      code: 'already-filed',
      extra: { by: 'its listening session', encounter: toFreya.number },
    });
  });

  test('with identifiers of another patient is refused, and the clip stays where it was', async () => {
    const clip = await house.clip({ device });
    const before = await kindsOf(house);
    expect(await refusal(file(solveig, clip, toFreya, wristbandOf(emeka)))).toMatchObject({
      code: 'identifiers-mismatch',
    });
    expect(
      await refusal(file(solveig, clip, toFreya, { ...wristbandOf(freya), second: 'Thackeray' })),
    ).toMatchObject({ code: 'identifiers-mismatch' });
    expect(await house.recording(clip.id)).toEqual(clip);
    expect(await house.filings(clip.id)).toEqual([]);
    expect(await kindsOf(house)).toEqual(before);
  });

  test('is not done for a clip that is still on its way, in quarantine, or not there', async () => {
    const clip = await house.clip({ device });
    const set = (values: Partial<Recording>) =>
      house.services.write(
        async (tx) => void (await tx.update(recording).set(values).where(eq(recording.id, clip.id))),
      );
    await set({ stage: 'received' });
    expect((await refusal(file(solveig, clip, toFreya, wristbandOf(freya)))).code).toBe('not-possible');
    await set({ stage: 'measured', stopped: 'bytes-mismatch' });
    expect((await refusal(file(solveig, clip, toFreya, wristbandOf(freya)))).code).toBe('not-found');
    const missing = { ...clip, number: '2222-2222' };
    expect((await refusal(file(solveig, missing, toFreya, wristbandOf(freya)))).code).toBe('not-found');
  });

  test('that dies before it commits leaves the clip in the tray; asked again it is filed', async () => {
    const clip = await house.clip({ device });
    const died = new Error('the process died');
    await expect(
      fileFromTray(
        house.services,
        bedsideAuthority(solveig),
        clip.number,
        { encounterId: toFreya.id, identifiers: wristbandOf(freya) },
        async () => Promise.reject(died),
      ),
    ).rejects.toBe(died);
    expect(await house.filings(clip.id)).toEqual([]);
    expect(await kindsOf(house)).not.toContain('filed');
    await file(solveig, clip, toFreya, wristbandOf(freya));
    expect(await house.filings(clip.id)).toHaveLength(1);
  });
});

describe('moving to another encounter', () => {
  test('supersedes the filing before, which stays readable, and tells both patients’ threads', async () => {
    const clip = await house.clip({ device });
    await file(solveig, clip, toFreya, wristbandOf(freya));
    house.clock.advance(60_000);
    await move(pascal, clip, toEmeka);
    const [old, fresh] = await house.filings(clip.id);
    expect(old).toMatchObject({ encounterId: toFreya.id, supersededBy: pascal.id });
    expect(fresh).toMatchObject({
      encounterId: toEmeka.id,
      patientId: emeka.id,
      reason: 'Recorded at the wrong bed',
      supersededAt: null,
    });
    expect(old?.supersededAt).toBe(fresh?.filedAt);
    const entry = (await entriesOf(house)).at(-1);
    expect(entry).toMatchObject({
      kind: 'filing-superseded',
      detail: {
        from: toFreya.number,
        to: toEmeka.number,
        reason: 'Recorded at the wrong bed',
        readingSigned: false,
      },
    });
    for (const id of [freya.id, emeka.id]) expect(entry?.subjects).toContainEqual({ kind: 'patient', id });
  });

  test('by two at once is done by one; the other is told where it is now', async () => {
    const third = await house.encounter(emeka);
    const clip = await house.clip({ device });
    await file(solveig, clip, toFreya, wristbandOf(freya));
    const { version } = await house.recording(clip.id);
    const results = await Promise.allSettled([
      move(solveig, clip, toEmeka, { version }),
      move(pascal, clip, third, { version }),
    ]);
    const loser = results.find((result) => result.status === 'rejected');
    const [, fresh, ...more] = await house.filings(clip.id);
    expect(more).toEqual([]);
    expect(loser?.reason).toMatchObject({
      code: 'stale',
      extra: {
        version: version + 1,
        encounter: fresh?.encounterId === toEmeka.id ? toEmeka.number : third.number,
      },
    });
  });

  test('there and back again is seen as a change by who looked before', async () => {
    const clip = await house.clip({ device });
    await file(solveig, clip, toFreya, wristbandOf(freya));
    const { version } = await house.recording(clip.id);
    await move(pascal, clip, toEmeka);
    await move(pascal, clip, toFreya);
    expect((await refusal(move(solveig, clip, toEmeka, { version }))).code).toBe('stale');
  });

  test('is refused without the identifiers of the patient it goes to', async () => {
    const clip = await house.clip({ device });
    await file(solveig, clip, toFreya, wristbandOf(freya));
    expect((await refusal(move(solveig, clip, toEmeka, { identifiers: wristbandOf(freya) }))).code).toBe(
      'identifiers-mismatch',
    );
    expect(await house.filings(clip.id)).toHaveLength(1);
  });

  test('to where it is, or of a clip in the tray, is not possible', async () => {
    const clip = await house.clip({ device });
    expect((await refusal(move(solveig, clip, toFreya))).code).toBe('not-possible');
    await file(solveig, clip, toFreya, wristbandOf(freya));
    expect((await refusal(move(solveig, clip, toFreya))).code).toBe('not-possible');
  });
});

describe('keeping a clip that should be recorded again', () => {
  const keep = (who: Clinician, clip: Recording, reason = 'The child would not allow another') =>
    keepAnyway(house.services, bedsideAuthority(who), clip.number, reason);

  test('leaves the verdict as it is, and stands in the patient’s thread with the reason', async () => {
    const clip = await house.clip({ device, verdict: 'repeat' });
    await file(solveig, clip, toFreya, wristbandOf(freya));
    await keep(solveig, clip);
    expect(await house.recording(clip.id)).toMatchObject({
      verdict: 'repeat',
      keptBy: solveig.id,
      keptReason: 'The child would not allow another',
    });
    const entry = (await entriesOf(house)).at(-1);
    expect(entry).toMatchObject({ kind: 'kept-anyway', detail: { number: clip.number } });
    expect(entry?.subjects).toContainEqual({ kind: 'patient', id: freya.id });
  });

  test.each(['usable', 'care'] as const)('is not possible for one that is %s', async (verdict) => {
    const clip = await house.clip({ device, verdict });
    expect((await refusal(keep(solveig, clip))).code).toBe('not-possible');
  });

  test('is done once: the first reason stands', async () => {
    const clip = await house.clip({ device, verdict: 'repeat' });
    await keep(solveig, clip);
    expect((await refusal(keep(pascal, clip, 'Something else entirely'))).code).toBe('not-possible');
    expect((await house.recording(clip.id)).keptBy).toBe(solveig.id);
  });
});
