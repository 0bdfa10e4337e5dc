import { createHash } from 'node:crypto';
import { eq } from 'drizzle-orm';
import { derivedObject, device, deviceModel, encounter, filing, patient, recording } from '@/db/schema';
import type { FindingCode, Severity, Verdict } from '@/lib/acoustics/types';
import { closeAnalysis, ingestServices } from '@/lib/http/passage';
import { measureRecording } from '@/lib/ingest/measureRecording';
import { newId, newRecordingNumber } from '@/lib/platform/ids';
import { addWard, authorityOf, type NewPerson, signedIn, type TestPerson } from './people';
import { type House, type HouseOptions, openHouse } from './services';

export type Patient = typeof patient.$inferSelect;
export type Encounter = typeof encounter.$inferSelect;
export type Device = typeof device.$inferSelect;
export type Recording = typeof recording.$inferSelect;
export type Clinician = TestPerson & { cookie: string; wardIds: string[] };

export interface ClipWanted {
  device: Device;
  /** UTC milliseconds; now unless told. */
  recordedAt?: number;
  verdict?: Verdict;
  findings?: { code: FindingCode; severity: Severity; value?: number }[];
  site?: string;
  scannedIdentifier?: string;
  /** Bytes of the original and its pictures; without, nothing lies in the store. */
  bytes?: Uint8Array;
}

export interface Bedside extends House {
  ward(name: string): Promise<string>;
  patient(more?: Partial<Patient>): Promise<Patient>;
  encounter(of: Patient, more?: Partial<Encounter>): Promise<Encounter>;
  device(more?: Partial<Device>): Promise<Device>;
  clinician(wardIds: string[], more?: Partial<NewPerson>): Promise<Clinician>;
  /** A clip that was sealed, then measured and placed as ingestion does it. */
  clip(wanted: ClipWanted): Promise<Recording>;
  recording(id: string): Promise<Recording>;
  filings(recordingId: string): Promise<(typeof filing.$inferSelect)[]>;
}

let counter = 0;
const tally = (): number => ++counter;

/** A house with a store, and short ways to what a ward has in it. */
export async function openBedside(options: HouseOptions = {}): Promise<Bedside> {
  const house = await openHouse({ storage: true, ...options });
  const { services } = house;
  const now = () => house.clock.now();
  const modelId = newId();
  await services.write(async (tx) => {
    await tx.insert(deviceModel).values({
      id: modelId,
      maker: 'Any',
      name: 'Any One',
      sampleRatesHz: [4000],
      bitDepths: [16],
      mediaTypes: ['audio/wav'],
      longestClipSeconds: 600,
      checkIntervalDays: 180,
      createdAt: now(),
    });
  });

  const add: Omit<Bedside, keyof House | 'clip'> = {
    ward: (name) => addWard(house, name),
    async patient(more = {}) {
      const row: Patient = {
        id: newId(),
        recordNumber: `HGH-204-${7000 + tally()}`,
        familyName: 'Ashgrove',
        givenName: 'Freya',
        birthDate: '1956-08-17',
        sex: null,
        fhirId: null,
        updatedAt: now(),
        ...more,
      };
      await services.write(async (tx) => void (await tx.insert(patient).values(row)));
      return row;
    },
    async encounter(of, more = {}) {
      const row: Encounter = {
        id: newId(),
        number: `E-${55_000 + tally()}`,
        patientId: of.id,
        wardId: null,
        bed: null,
        status: 'in-progress',
        class: 'IMP',
        startedAt: now() - 86_400_000,
        endedAt: null,
        fhirId: null,
        updatedAt: now(),
        ...more,
      };
      await services.write(async (tx) => void (await tx.insert(encounter).values(row)));
      return row;
    },
    async device(more = {}) {
      const nth = tally();
      await services.write(
        async (tx) =>
          void (await tx.insert(device).values({
            id: `device-${nth}`,
            assetTag: `HM-${1000 + nth}`,
            serialNumber: `SN-${nth}`,
            modelId,
            state: 'in-service',
            createdAt: now(),
            ...more,
          })),
      );
      const [row] = await services.read
        .select()
        .from(device)
        .where(eq(device.id, more.id ?? `device-${nth}`));
      if (!row) throw new Error('no device');
      return row;
    },
    async clinician(wardIds, more = {}) {
      const person = await signedIn(house, { roles: ['clinician'], wardIds, ...more });
      return { ...person, wardIds };
    },
    async recording(id) {
      const [row] = await services.read.select().from(recording).where(eq(recording.id, id));
      if (!row) throw new Error('no recording');
      return row;
    },
    filings: (recordingId) =>
      services.read.select().from(filing).where(eq(filing.recordingId, recordingId)).orderBy(filing.filedAt),
  };

  return {
    ...house,
    get fake() {
      return house.fake;
    },
    ...add,
    async clip(wanted) {
      const id = await insertSealed(house, wanted);
      await measureRecording(
        ingestServices(services),
        { id, slotKey: `incoming/${id}` },
        {
          verdict: wanted.verdict ?? 'usable',
          findings: wanted.findings ?? [],
          measures: null,
          facts: {},
          metadata: null,
          peaks: wanted.bytes ?? null,
          spectrogram: wanted.bytes ?? null,
        },
        1,
      );
      return await add.recording(id);
    },
    async close() {
      await house.close();
      await closeAnalysis();
    },
  };
}

async function insertSealed(house: House, wanted: ClipWanted): Promise<string> {
  const id = newId();
  const now = house.clock.now();
  const recordedAt = wanted.recordedAt ?? now;
  const originalKey = `originals/${id}`;
  if (wanted.bytes)
    await house.services.storage.put({ key: originalKey, body: wanted.bytes, contentType: 'audio/wav' });
  await house.services.write(async (tx) => {
    await tx.insert(recording).values({
      id,
      number: newRecordingNumber(),
      deviceId: wanted.device.id,
      modelId: wanted.device.modelId,
      deviceRecordingNumber: id,
      stage: 'sealed',
      declaredSha256: createHash('sha256')
        .update(wanted.bytes ?? id)
        .digest('hex'),
      declaredBytes: wanted.bytes?.length ?? 1,
      mediaType: 'audio/wav',
      recordedAtDevice: recordedAt,
      recordedAt,
      clockOffsetMs: 0,
      site: wanted.site ?? null,
      scannedIdentifier: wanted.scannedIdentifier ?? null,
      requestHash: id,
      slotKey: `incoming/${id}`,
      slotExpiresAt: now + 300_000,
      awaitedAt: now,
      receivedAt: now,
      sealedAt: now,
      originalKey: wanted.bytes ? originalKey : null,
    });
  });
  return id;
}

/** A clinician's authority for every verb of Bedside, for calling one without a route. */
export const bedsideAuthority = (person: Clinician) =>
  authorityOf<'bedside.read'>(person, { wardIds: person.wardIds }) as ReturnType<
    typeof authorityOf<'bedside.read'>
  > &
    ReturnType<typeof authorityOf<'session.write'>> &
    ReturnType<typeof authorityOf<'filing.write'>> &
    ReturnType<typeof authorityOf<'recording.keep'>> &
    ReturnType<typeof authorityOf<'recording.read'>>;

/** The two identifiers of a patient, as read from the wristband. */
export const wristbandOf = (who: Patient) => ({ recordNumber: who.recordNumber, second: who.familyName });

/** Hashes of the pictures that are derived from a recording, by kind. */
export async function picturesOf(house: House, recordingId: string): Promise<Map<string, string>> {
  const rows = await house.services.read
    .select()
    .from(derivedObject)
    .where(eq(derivedObject.recordingId, recordingId));
  return new Map(rows.map((row) => [row.kind, row.sha256]));
}
