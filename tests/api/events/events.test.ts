import { eq } from 'drizzle-orm';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { GET as eventsRoute } from '@/app/api/events/route';
import { personWard } from '@/db/schema';
import { appendEntries } from '@/lib/custody/append';
import { SERVICE_ACTOR } from '@/lib/custody/entry';
import { endStreams, STREAMS_A_PERSON } from '@/lib/http/liveEvents';
import { type Bedside, type Clinician, type Device, openBedside } from '@/tests/support/bedside';
import { call, problemOf } from '@/tests/support/call';
import { signedIn } from '@/tests/support/people';

interface Event {
  kind: string;
  subjects: { kind: string; id: string }[];
  sequence: number;
}

let house: Bedside;
let alder: string;
let solveig: Clinician;
let elsewhere: Clinician;
let device: Device;

beforeEach(async () => {
  house = await openBedside();
  alder = await house.ward('Alder');
  solveig = await house.clinician([alder]);
  elsewhere = await house.clinician([await house.ward('Birch')]);
  device = await house.device({ wardId: alder });
});
afterEach(async () => {
  endStreams();
  await house.close();
});

/** A stream as a page reads it. */
async function listen(who: { cookie: string }) {
  const answer = await call(eventsRoute, { cookie: who.cookie });
  expect(answer.headers.get('content-type')).toBe('text/event-stream; charset=utf-8');
  const reader = answer.body?.pipeThrough(new TextDecoderStream()).getReader();
  if (!reader) throw new Error('no stream');
  let text = '';
  let over = false;
  const read = async (): Promise<boolean> => {
    const { done, value } = await reader.read();
    over = done;
    text += value ?? '';
    return !done;
  };
  const events = (): Event[] =>
    [...text.matchAll(/^data: (.*)$/gm)].map((match) => JSON.parse(match[1] ?? '') as Event);
  return {
    events,
    isOver: () => over,
    /** Read on until an event of this kind came, or the stream ended. */
    async until(kind: string): Promise<Event | undefined> {
      for (;;) {
        const found = events().find((event) => event.kind === kind);
        if (found || !(await read())) return found;
      }
    },
    async toEnd(): Promise<void> {
      while (await read());
    },
    close: () => reader.cancel(),
  };
}

/** Something that everybody hears: after it, nothing that came before is still to come. */
const bell = () =>
  house.services.write((tx) =>
    appendEntries(tx, house.clock.now(), [
      { kind: 'policy-changed', actor: SERVICE_ACTOR, subjects: [{ kind: 'policy', id: '1' }] },
    ]),
  );

const kindsOf = (events: Event[]) => events.map((event) => event.kind);

describe('a clip that is filed', () => {
  test('is heard of by the ward it belongs to, with what changed and never what it says', async () => {
    const place = await house.encounter(await house.patient(), { wardId: alder });
    const stream = await listen(solveig);
    const clip = await house.clip({ device, scannedIdentifier: place.number, verdict: 'repeat' });
    const event = await stream.until('filed');
    expect(event).toEqual({
      kind: 'filed',
      sequence: expect.any(Number),
      subjects: [
        { kind: 'recording', id: clip.id },
        { kind: 'encounter', id: place.id },
        { kind: 'patient', id: place.patientId },
        { kind: 'device', id: device.id },
      ],
    });
    expect(kindsOf(stream.events())).toEqual(['measured', 'filed']);
  });

  test('is not heard of by another ward: nothing of recording, encounter or patient', async () => {
    const place = await house.encounter(await house.patient(), { wardId: alder });
    const stream = await listen(elsewhere);
    await house.clip({ device, scannedIdentifier: place.number });
    await bell();
    await stream.until('policy-changed');
    const kinds = stream.events().flatMap((event) => event.subjects.map((subject) => subject.kind));
    expect(kinds.filter((kind) => ['recording', 'encounter', 'patient', 'session'].includes(kind))).toEqual(
      [],
    );
  });

  test('by nobody yet is heard of by the ward of its device', async () => {
    const [mine, theirs] = [await listen(solveig), await listen(elsewhere)];
    const clip = await house.clip({ device });
    await bell();
    expect((await mine.until('put-in-tray'))?.subjects).toContainEqual({ kind: 'recording', id: clip.id });
    await theirs.until('policy-changed');
    expect(JSON.stringify(theirs.events())).not.toContain(clip.id);
  });
});

test('what happened before the stream began is not told', async () => {
  await bell();
  const stream = await listen(solveig);
  await bell();
  await stream.until('policy-changed');
  expect(stream.events()).toHaveLength(1);
});

test('an auditor hears of every ward', async () => {
  const auditor = await signedIn(house, { roles: ['auditor'] });
  const place = await house.encounter(await house.patient(), { wardId: alder });
  const stream = await listen(auditor);
  await house.clip({ device, scannedIdentifier: place.number });
  expect((await stream.until('filed'))?.subjects).toContainEqual({ kind: 'patient', id: place.patientId });
});

test('an engineer hears of recordings and devices, and of no patient', async () => {
  const engineer = await signedIn(house, { roles: ['biomed'] });
  const place = await house.encounter(await house.patient(), { wardId: alder });
  const stream = await listen(engineer);
  await house.clip({ device, scannedIdentifier: place.number });
  const subjects = (await stream.until('filed'))?.subjects.map(({ kind }) => kind);
  expect(subjects).toEqual(['recording', 'device']);
});

test('a burst of entries is told whole and in order', async () => {
  const stream = await listen(solveig);
  for (let i = 0; i < 450; i++) await bell();
  await house.clip({ device });
  await stream.until('put-in-tray');
  const sequences = stream.events().map((event) => event.sequence);
  expect(sequences).toHaveLength(452);
  expect(sequences).toEqual([...sequences].sort((a, b) => a - b));
});

describe('a stream ends', () => {
  test('when the process is about to stop, so that stopping does not wait', async () => {
    const stream = await listen(solveig);
    endStreams();
    await stream.toEnd();
    expect(stream.isOver()).toBe(true);
  });

  test('when the person’s wards change: what one may hear is read anew', async () => {
    const stream = await listen(solveig);
    await house.services.write(async (tx) => {
      await tx.delete(personWard).where(eq(personWard.personId, solveig.id));
      await appendEntries(tx, house.clock.now(), [
        { kind: 'wards-changed', actor: SERVICE_ACTOR, subjects: [{ kind: 'person', id: solveig.id }] },
      ]);
    });
    await house.clip({ device });
    await stream.toEnd();
    expect(kindsOf(stream.events())).not.toContain('put-in-tray');
  });
});

test('nobody holds more streams than a few windows need, and a closed one makes room', async () => {
  const open = [];
  for (let i = 0; i < STREAMS_A_PERSON; i++) open.push(await listen(solveig));
  const refused = await call(eventsRoute, { cookie: solveig.cookie });
  expect((await problemOf(refused)).code).toBe('too-many-requests');
  expect(refused.headers.get('retry-after')).toBe('30');
  await listen(elsewhere);
  await open[0]?.close();
  await listen(solveig);
});
