import { eq } from 'drizzle-orm';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { encounter } from '@/db/schema';
import { EncounterFilter, listEncounters } from '@/lib/filing/readEncounters';
import { giveReason, isOutsideWards, maySeePatient, REASON_LASTS_MS } from '@/lib/records/patientAccess';
import {
  type Bedside,
  bedsideAuthority,
  type Clinician,
  type Encounter,
  openBedside,
  type Patient,
} from '@/tests/support/bedside';
import { entriesOf, kindsOf } from '@/tests/support/entries';

const DAY_MS = 86_400_000;
let house: Bedside;
let alder: string;
let solveig: Clinician;
let outsider: Patient;
let outside: Encounter;

beforeEach(async () => {
  house = await openBedside();
  alder = await house.ward('Alder');
  const birch = await house.ward('Birch');
  solveig = await house.clinician([alder]);
  outsider = await house.patient({ familyName: 'Outside' });
  outside = await house.encounter(outsider, { wardId: birch });
});
afterEach(() => house.close());

const maySee = (who: Patient) => maySeePatient(house.services, bedsideAuthority(solveig), who.id);
const give = (identifier: string, reason = 'Asked for by the night team') =>
  giveReason(house.services, bedsideAuthority(solveig), { identifier, reason });
const names = async () =>
  (await listEncounters(house.services, bedsideAuthority(solveig), EncounterFilter.parse({}))).rows.map(
    (row) => row.familyName,
  );

describe('one’s own wards', () => {
  test('open those who are on them, and those who lately were', async () => {
    const here = await house.patient();
    await house.encounter(here, { wardId: alder });
    expect(await maySee(here)).toBe(true);
    const left = await house.patient();
    await house.encounter(left, {
      wardId: alder,
      status: 'finished',
      endedAt: house.clock.now() - 29 * DAY_MS,
      startedAt: house.clock.now() - 40 * DAY_MS,
    });
    expect(await maySee(left)).toBe(true);
    house.clock.advance(2 * DAY_MS);
    expect(await maySee(left)).toBe(false);
  });

  test('do not open whoever was put on them by mistake', async () => {
    const mistaken = await house.patient();
    await house.encounter(mistaken, { wardId: alder, status: 'cancelled' });
    expect(await maySee(mistaken)).toBe(false);
  });

  test('do not open the patients of another', async () => {
    expect(await maySee(outsider)).toBe(false);
    expect(await names()).toEqual([]);
  });
});

describe('a reason', () => {
  test('opens the patient for twelve hours, and the auditor is shown it', async () => {
    const given = await give(outsider.recordNumber);
    expect(given).toEqual({ patientId: outsider.id, encounterId: outside.id });
    expect(await maySee(outsider)).toBe(true);
    expect(await names()).toEqual(['Outside']);
    expect((await entriesOf(house)).at(-1)).toMatchObject({
      kind: 'access-outside-wards',
      actor: { id: solveig.id },
      subjects: [
        { kind: 'patient', id: outsider.id },
        { kind: 'person', id: solveig.id },
      ],
      detail: { reason: 'Asked for by the night team' },
    });
    house.clock.advance(REASON_LASTS_MS + 1);
    expect(await maySee(outsider)).toBe(false);
    expect(await names()).toEqual([]);
  });

  test('opens the patient to the person who gave it and to nobody else', async () => {
    await give(outside.number);
    const other = await house.clinician([alder]);
    expect(await maySeePatient(house.services, bedsideAuthority(other), outsider.id)).toBe(false);
  });

  test('with an encounter’s number leads to that encounter, with a record number to the latest', async () => {
    const later = await house.encounter(outsider, { startedAt: house.clock.now() });
    expect((await give(outside.number)).encounterId).toBe(outside.id);
    expect((await give(outsider.recordNumber.toLowerCase())).encounterId).toBe(later.id);
  });

  test('with part of a number opens nobody, and nothing is written', async () => {
    await expect(give(outsider.recordNumber.slice(0, -1))).rejects.toMatchObject({ code: 'not-found' });
    expect(await kindsOf(house)).not.toContain('access-outside-wards');
  });
});

describe('whether a reason is asked for', () => {
  const asked = (text: string) => isOutsideWards(house.services, bedsideAuthority(solveig), text);

  test('only for the whole number of somebody outside the wards', async () => {
    expect(await asked(outsider.recordNumber)).toBe(true);
    expect(await asked(outside.number.toLowerCase())).toBe(true);
    expect(await asked(outsider.recordNumber.slice(0, -1))).toBe(false);
    expect(await asked('Outside')).toBe(false);
    expect(await asked('')).toBe(false);
  });

  test('not for somebody who may be seen', async () => {
    await house.services.write(
      async (tx) =>
        void (await tx.update(encounter).set({ wardId: alder }).where(eq(encounter.id, outside.id))),
    );
    expect(await asked(outsider.recordNumber)).toBe(false);
  });
});
