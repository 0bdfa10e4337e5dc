import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { GET as searchRoute } from '@/app/api/search/route';
import {
  type Bedside,
  type Clinician,
  type Device,
  type Encounter,
  openBedside,
  type Patient,
  type Recording,
} from '@/tests/support/bedside';
import { call } from '@/tests/support/call';
import { signedIn } from '@/tests/support/people';

interface Found {
  kind: string;
  label: string;
  detail: string;
  href: string;
}

let house: Bedside;
let solveig: Clinician;
let device: Device;
let freya: Patient;
let place: Encounter;
let outsider: Patient;
let outside: Encounter;
let clip: Recording;
let hidden: Recording;

beforeEach(async () => {
  house = await openBedside();
  const alder = await house.ward('Alder');
  const birch = await house.ward('Birch');
  solveig = await house.clinician([alder]);
  device = await house.device({ wardId: alder });
  freya = await house.patient();
  place = await house.encounter(freya, { wardId: alder });
  outsider = await house.patient({ familyName: 'Outside' });
  outside = await house.encounter(outsider, { wardId: birch });
  clip = await house.clip({ device, scannedIdentifier: place.number });
  hidden = await house.clip({ device, scannedIdentifier: outside.number });
});
afterEach(() => house.close());

const find = async (q: string, who: { cookie: string } = solveig): Promise<Found[]> => {
  const answer = await call(searchRoute, {
    path: `/api/search?q=${encodeURIComponent(q)}`,
    cookie: who.cookie,
  });
  return ((await answer.json()) as { results: Found[] }).results;
};
const hrefs = async (q: string, who?: { cookie: string }) => (await find(q, who)).map((one) => one.href);

describe('a clinician finds', () => {
  test('a recording by its number', async () => {
    expect(await find(clip.number.toLowerCase())).toEqual([
      {
        kind: 'recording',
        label: clip.number,
        detail: `filed to ${place.number}`,
        href: `/recordings/${clip.number}`,
      },
    ]);
  });

  test('a patient by record number, encounter number or family name', async () => {
    for (const word of [freya.recordNumber, place.number, 'ashg'])
      expect(await hrefs(word)).toContain(`/encounters/${place.id}`);
  });

  test('a device by its asset tag, and a room by its name', async () => {
    expect(await hrefs(device.assetTag)).toContain(`/devices/${device.id}`);
    expect(await hrefs('beds')).toEqual(['/bedside']);
    expect(await hrefs('key ro')).toEqual([]);
  });

  test('nothing of another ward: no recording, no name, no part of a number', async () => {
    expect(await find(hidden.number)).toEqual([]);
    expect(await find('Outside')).toEqual([]);
    expect(await find(outsider.recordNumber.slice(0, -1))).not.toContainEqual(
      expect.objectContaining({ href: `/encounters/${outside.id}` }),
    );
  });

  test('for the whole number of another ward’s patient the way to give a reason, and nothing about them', async () => {
    for (const number of [outsider.recordNumber, outside.number]) {
      const found = await find(number);
      expect(found.map((one) => one.href)).toEqual([`/bedside?q=${number}`]);
      expect(JSON.stringify(found)).not.toContain('Outside');
    }
  });

  test('nothing for one letter, and nothing for signs of patterns', async () => {
    expect(await find('A')).toEqual([]);
    expect(await find('%%')).toEqual([]);
    expect(await find('__')).toEqual([]);
  });
});

describe('others', () => {
  test('an engineer finds devices and no patient', async () => {
    const engineer = await signedIn(house, { roles: ['biomed'] });
    expect(await hrefs(device.assetTag, engineer)).toEqual([`/devices/${device.id}`]);
    expect(await find(freya.recordNumber, engineer)).toEqual([]);
    expect(await find(clip.number, engineer)).toEqual([]);
  });

  test('an auditor finds recordings and patients of any ward, and is led to their threads', async () => {
    const auditor = await signedIn(house, { roles: ['auditor'] });
    expect(await hrefs(hidden.number, auditor)).toEqual([`/recordings/${hidden.number}`]);
    expect(await hrefs(outsider.recordNumber, auditor)).toEqual([`/ledger/patient/${outsider.id}`]);
  });
});
