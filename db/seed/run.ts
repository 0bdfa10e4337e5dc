import { existsSync, writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { eq } from 'drizzle-orm';
import { applyMigrations } from '@/db/migrate';
import { device, encounter, patient, policy, ward } from '@/db/schema';
import { DEFAULT_LIMITS } from '@/lib/acoustics/judge';
import { appendEntries } from '@/lib/custody/append';
import { SERVICE_ACTOR } from '@/lib/custody/entry';
import { makeHead } from '@/lib/custody/heads/makeHead';
import { describeModel } from '@/lib/fleet/describeModel';
import { closeAnalysis } from '@/lib/http/passage';
import { createServices } from '@/lib/http/services';
import { headSigner } from '@/lib/http/treeHeads';
import { readEnv } from '@/lib/platform/env';
import { newId } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';
import { addSeedDevice, enrolSeedDevice, type SeedClock, type SeededDevice } from './fleetRows';
import { FAMILY, GIVEN, MODELS, seedDevices, WARDS } from './harrowmere';
import { DAY_MS, type Listener, MINUTE_MS, type Place, sendClip, visit } from './history';
import { type SeededPerson, seedPeople, signInsText } from './people';
import { createRandom } from './random';

const RECORDINGS = Number(process.env.SEED_RECORDINGS ?? 300);
const DAYS = 60;

/** Harrowmere General Hospital from nothing: people, fleet, patients, and two months of recordings, lived through in order. */
async function seed(): Promise<void> {
  const env = readEnv({ ...process.env, LOG_LEVEL: process.env.LOG_LEVEL === 'debug' ? 'debug' : 'warn' });
  const folder = dirname(env.DATABASE_URL.replace(/^file:/, ''));
  const marker = join(folder, 'sign-ins.txt');
  if (existsSync(marker)) return;
  const end = Date.now();
  let at = end - 90 * DAY_MS;
  const clock: SeedClock = {
    now: () => at,
    set: (to) => {
      at = Math.max(at, Math.round(to));
    },
  };
  const services = await createServices(env, { clock });
  await applyMigrations(services.database);
  const [already] = await services.read.select({ id: ward.id }).from(ward).limit(1);
  if (already)
    throw new Error('The data folder holds a house that was not finished. Remove .data and start again.');
  const random = createRandom(20_261_201);

  const wardIds = await seedWards(services);
  const people = await seedPeople(services, wardIds);
  const engineer = people.find((person) => person.roles.includes('biomed')) as SeededPerson;
  const by = { kind: 'person' as const, id: engineer.id, label: engineer.name, role: 'biomed' };
  await services.write(async (tx) => {
    await tx
      .insert(policy)
      .values({ version: 1, limits: { ...DEFAULT_LIMITS }, madeBy: null, madeAt: at, note: 'Defaults' });
    await appendEntries(tx, at, [
      {
        kind: 'policy-changed',
        actor: SERVICE_ACTOR,
        subjects: [{ kind: 'policy', id: '1' }],
        after: { version: 1 },
      },
    ]);
  });
  const modelIds = new Map<string, string>();
  for (const model of MODELS) modelIds.set(model.name, await describeModel(services, by, model));
  const fleet: SeededDevice[] = [];
  for (const facts of seedDevices(random))
    fleet.push(
      await addSeedDevice(services, by, facts, {
        modelId: modelIds.get(facts.model) ?? '',
        wardId: wardIds.get(facts.ward) ?? '',
      }),
    );
  const places = await seedPatients(services, wardIds, random, end);
  const listeners: Listener[] = people
    .filter((person) => person.roles.includes('clinician'))
    .map((person) => ({
      wards: person.wards,
      person: {
        id: person.id,
        name: person.name,
        email: person.email,
        jobTitle: person.jobTitle,
        roles: person.roles,
        wardIds: person.wards.map((name) => wardIds.get(name) ?? ''),
        sessionId: '',
      } as unknown as Listener['person'],
    }));
  await live(services, clock, { fleet, places, listeners, by, random, end });
  await services.write(async (tx) => {
    for (const one of fleet)
      if (one.state !== 'waiting' && one.state !== 'in-service') {
        await tx
          .update(device)
          .set({ state: one.state, stateReason: one.stateReason ?? null })
          .where(eq(device.id, one.id));
        await appendEntries(tx, end, [
          {
            kind: 'device-state-changed',
            actor: by,
            subjects: [{ kind: 'device', id: one.id }],
            detail: { reason: one.stateReason ?? '' },
            before: { state: 'in-service' },
            after: { state: one.state },
          },
        ]);
      }
  });
  await hearFrom(services, fleet, random, end);
  services.database.close();
  await closeAnalysis();
  writeFileSync(marker, signInsText(people), { mode: 0o600 });
}

/** Devices say how they are although nobody records with them; one has gone quiet. */
async function hearFrom(
  services: Services,
  fleet: SeededDevice[],
  random: ReturnType<typeof createRandom>,
  end: number,
): Promise<void> {
  await services.write(async (tx) => {
    for (const one of fleet) {
      if (one.state !== 'in-service' || one.assetTag === 'HM-0369') continue;
      const lastHeardAt = end - random.whole(1, 600) * MINUTE_MS;
      await tx
        .update(device)
        .set({ lastHeardAt, batteryPercent: random.whole(20, 100), clockOffsetMs: random.whole(-3000, 3000) })
        .where(eq(device.id, one.id));
    }
  });
}

async function seedWards(services: Services): Promise<Map<string, string>> {
  const ids = new Map<string, string>();
  await services.write(async (tx) => {
    for (const name of WARDS) {
      ids.set(name, newId());
      await tx.insert(ward).values({ id: ids.get(name) ?? '', name, createdAt: services.clock.now() });
    }
  });
  return ids;
}

async function seedPatients(
  services: Services,
  wardIds: Map<string, string>,
  random: ReturnType<typeof createRandom>,
  end: number,
): Promise<Place[]> {
  const places: Place[] = [];
  const beds = ['Alder', 'Birch', 'Cedar', 'Rowan', 'Emergency department'];
  await services.write(async (tx) => {
    for (let i = 0; i < 44; i++) {
      const patientId = newId();
      const recordNumber = `HGH-${String(204 + Math.floor(i / 9)).padStart(3, '0')}-${String(1000 + ((i * 7919 + 6718) % 9000)).padStart(4, '0')}`;
      await tx.insert(patient).values({
        id: patientId,
        recordNumber,
        familyName: FAMILY[i % FAMILY.length] ?? '',
        givenName: GIVEN[(i * 5) % GIVEN.length] ?? '',
        birthDate: `${random.whole(1934, 2019)}-${String(random.whole(1, 12)).padStart(2, '0')}-${String(random.whole(1, 28)).padStart(2, '0')}`,
        sex: random.pick(['female', 'male', 'unknown']),
        updatedAt: end,
      });
      const wardName = beds[i % beds.length] ?? 'Alder';
      const startedAt = end - random.whole(1, DAYS) * DAY_MS - random.whole(0, 600) * MINUTE_MS;
      const ended = i % 4 === 3 ? Math.min(end - DAY_MS / 2, startedAt + random.whole(2, 12) * DAY_MS) : null;
      const encounterId = newId();
      await tx.insert(encounter).values({
        id: encounterId,
        number: `E-${55_100 + i * 3}`,
        patientId,
        wardId: wardIds.get(wardName) ?? null,
        bed: `${wardName[0]}${random.whole(1, 24)}`,
        status: ended === null ? 'in-progress' : 'finished',
        class: 'IMP',
        startedAt,
        endedAt: ended,
        updatedAt: end,
      });
      places.push({ encounterId, recordNumber, ward: wardName, startedAt, endedAt: ended });
    }
  });
  // While history is lived through every encounter is still running; afterwards those that ended have ended.
  return places;
}

interface House {
  fleet: SeededDevice[];
  places: Place[];
  listeners: Listener[];
  by: { kind: 'person'; id: string; label: string; role: string };
  random: ReturnType<typeof createRandom>;
  end: number;
}

async function live(services: Services, clock: SeedClock, house: House): Promise<void> {
  const { fleet, places, listeners, by, random, end } = house;
  const toEnrol = fleet
    .filter((one) => one.enrolledDaysAgo !== null)
    .sort((a, b) => (b.enrolledDaysAgo ?? 0) - (a.enrolledDaysAgo ?? 0));
  let sent = 0;
  let enrolled = 0;
  let headAt = 0;
  const enrolUntil = async (moment: number) => {
    for (; enrolled < toEnrol.length; enrolled++) {
      const next = toEnrol[enrolled] as SeededDevice;
      const when = end - (next.enrolledDaysAgo ?? 0) * DAY_MS;
      if (when > moment) return;
      clock.set(when);
      await enrolSeedDevice(services, by, next);
    }
  };
  const visits = Math.round(RECORDINGS / 3.6);
  for (let v = 0; v < visits && sent < RECORDINGS; v++) {
    const moment =
      end - DAYS * DAY_MS + ((DAYS * DAY_MS - 40 * MINUTE_MS) * (v + random.next() * 0.6)) / visits;
    await enrolUntil(moment);
    clock.set(moment);
    if (moment > headAt + DAY_MS) {
      await makeHead(services, await headSigner(services));
      headAt = moment;
    }
    const ready = fleet.filter(
      (one) => one.authenticated && (one.assetTag !== 'HM-0369' || moment < end - 6 * DAY_MS),
    );
    // The two that drift are used often enough that it shows.
    const from = random.chance(0.22)
      ? (ready.find((one) => one.drift !== 'none' && random.chance(0.5)) ?? random.pick(ready))
      : random.pick(ready);
    if (!from) continue;
    const open = places.filter(
      (place) =>
        place.ward === from.ward &&
        place.startedAt < moment &&
        (place.endedAt === null || place.endedAt > moment + 30 * MINUTE_MS),
    );
    const here = open.length > 0 ? random.pick(open) : null;
    const listener = listeners.find((one) => one.wards.includes(from.ward)) ?? null;
    // The seed's encounters that ended are already so; their visits are by scanned wristband.
    const stray = random.chance(0.09) || !here || !listener || here.endedAt !== null;
    if (stray) {
      await sendClip(services, clock, from, random, {
        agesDays: (end - moment) / DAY_MS,
        ...(here && random.chance(0.6) ? { scannedIdentifier: here.recordNumber } : {}),
      });
      sent++;
    } else sent += await visit(services, clock, from, here, listener, random, (end - moment) / DAY_MS);
  }
  await enrolUntil(end);
  clock.set(end);
}

await seed();
