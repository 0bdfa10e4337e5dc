import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { GET as oneRoute } from '@/app/api/encounters/[id]/route';
import { GET as listRoute } from '@/app/api/encounters/route';
import { POST as reasonRoute } from '@/app/api/patients/reason/route';
import {
  type Bedside,
  type Clinician,
  type Encounter,
  openBedside,
  type Patient,
} from '@/tests/support/bedside';
import { call, problemOf } from '@/tests/support/call';

interface List {
  rows: { id: string; familyName: string; clips: number; latest: unknown; sessions: unknown[] }[];
  next: string | null;
  counts: { encounters: number; listening: number; tray: number; wards: { name: string }[] };
}

let house: Bedside;
let alder: string;
let birch: string;
let solveig: Clinician;
let outsider: Patient;
let outside: Encounter;

beforeEach(async () => {
  house = await openBedside();
  alder = await house.ward('Alder');
  birch = await house.ward('Birch');
  solveig = await house.clinician([alder]);
  outsider = await house.patient({ familyName: 'Outside' });
  outside = await house.encounter(outsider, { wardId: birch });
});
afterEach(() => house.close());

const list = (query = '', who = solveig) =>
  call(listRoute, { path: `/api/encounters${query}`, cookie: who.cookie });
const rowsOf = async (query = ''): Promise<List> => (await (await list(query)).json()) as List;
const one = (id: string, who = solveig) => call(oneRoute, { params: { id }, cookie: who.cookie });
const admit = async (familyName: string, more: Partial<Encounter> = {}) =>
  house.encounter(await house.patient({ familyName }), { wardId: alder, ...more });

describe('the list', () => {
  test('holds running encounters of one’s wards by name, whatever the case, and what was heard last', async () => {
    const zeller = await admit('zeller');
    await admit('Adeyemi');
    await admit('Gone', { status: 'finished' });
    const device = await house.device({ wardId: alder });
    const clip = await house.clip({ device, scannedIdentifier: zeller.number, verdict: 'care' });
    const { rows, counts } = await rowsOf();
    expect(rows.map((row) => row.familyName)).toEqual(['Adeyemi', 'zeller']);
    expect(rows[1]).toMatchObject({
      clips: 1,
      latest: { number: clip.number, stage: 'filed', verdict: 'care' },
      sessions: [],
    });
    expect(counts).toEqual({ encounters: 2, listening: 0, tray: 0, wards: [{ id: alder, name: 'Alder' }] });
  });

  test('is turned over page by page without losing or repeating anybody, namesakes too', async () => {
    for (const name of ['Ames', 'ames', 'AMES', 'Berg', 'Ames']) await admit(name);
    const seen: string[] = [];
    let after = '';
    do {
      const page = await rowsOf(`?limit=2${after}`);
      seen.push(...page.rows.map((row) => row.id));
      after = page.next ? `&after=${encodeURIComponent(page.next)}` : '';
    } while (after);
    expect(seen).toHaveLength(5);
    expect(new Set(seen).size).toBe(5);
  });

  test.each(['not-ours', encodeURIComponent('["a"]'), Buffer.from('{"a":1}').toString('base64url')])(
    'refuses %s as a place in it',
    async (after) => {
      const answer = await list(`?after=${after}`);
      expect(answer.status).toBe(400);
      expect((await problemOf(answer)).code).toBe('body-invalid');
    },
  );

  test('takes a search as it is written, signs of patterns too', async () => {
    await admit('Ames', { bed: 'A5' });
    await admit('100% sure');
    const found = async (q: string) =>
      (await rowsOf(`?q=${encodeURIComponent(q)}`)).rows.map((row) => row.familyName);
    expect(await found('%')).toEqual(['100% sure']);
    expect(await found('_')).toEqual([]);
    expect(await found('ame')).toEqual(['Ames']);
    expect(await found('A5')).toEqual(['Ames']);
  });

  test('narrows to one ward, and another’s ward gives nobody', async () => {
    await admit('Ames');
    expect((await rowsOf(`?ward=${alder}`)).rows).toHaveLength(1);
    expect((await rowsOf(`?ward=${birch}`)).rows).toEqual([]);
  });

  test('of somebody on no ward is empty', async () => {
    await admit('Ames');
    const nobody = await house.clinician([]);
    expect(await (await list('', nobody)).json()).toMatchObject({ rows: [], counts: { encounters: 0 } });
  });
});

describe('a patient outside one’s wards', () => {
  test('is not found by name, nor by a part of the number', async () => {
    expect((await rowsOf('?q=Outside')).rows).toEqual([]);
    expect((await rowsOf(`?q=${outsider.recordNumber.slice(0, -1)}`)).rows).toEqual([]);
  });

  test('found by the whole number asks for the reason, and says nothing of the patient', async () => {
    for (const number of [outsider.recordNumber, outside.number]) {
      const answer = await list(`?q=${number}`);
      expect(answer.status).toBe(403);
      const { code, body } = await problemOf(answer);
      expect(code).toBe('reason-required');
      expect(body.identifier).toBe(number);
      expect(JSON.stringify(body)).not.toContain('Outside');
    }
  });

  test('looked for under a number that nobody has answers with an empty list', async () => {
    expect((await rowsOf('?q=HGH-000-0000')).rows).toEqual([]);
  });

  test('opened with a reason stands in the list and can be read', async () => {
    const body = { identifier: outside.number, reason: 'Asked for by the night team' };
    const given = await call(reasonRoute, { body, cookie: solveig.cookie });
    expect(given.status).toBe(200);
    expect((await rowsOf()).rows.map((row) => row.familyName)).toEqual(['Outside']);
    expect((await one(outside.id)).status).toBe(200);
  });

  test('is not opened by a reason of four letters', async () => {
    const body = { identifier: outside.number, reason: 'look' };
    const answer = await call(reasonRoute, { body, cookie: solveig.cookie });
    expect((await problemOf(answer)).code).toBe('body-invalid');
  });
});

describe('one encounter', () => {
  test('is read by id or by number, with its clips and sessions', async () => {
    const ames = await admit('Ames');
    const device = await house.device({ wardId: alder });
    const clip = await house.clip({ device, scannedIdentifier: ames.number });
    for (const name of [ames.id, ames.number, ames.number.toLowerCase()])
      expect(await (await one(name)).json()).toMatchObject({
        id: ames.id,
        clips: [{ number: clip.number }],
        sessions: [],
      });
  });

  test('of another ward answers by id like what does not exist, and by number asks for a reason', async () => {
    const without = async (answer: Response) => ({ ...((await answer.json()) as object), requestId: '' });
    const hidden = await one(outside.id);
    const missing = await one('not-there');
    expect(hidden.status).toBe(404);
    expect(await without(hidden)).toEqual(await without(missing));
    expect((await problemOf(await one(outside.number))).code).toBe('reason-required');
    expect((await problemOf(await one('E-00000'))).code).toBe('not-found');
  });
});
