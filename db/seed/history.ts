import { createHash } from 'node:crypto';
import { eq } from 'drizzle-orm';
import { device, recording } from '@/db/schema';
import { synthesise } from '@/devices/synth/chest';
import { recipeOf, usualRecipe } from '@/devices/synth/recipes';
import { encodeWav } from '@/devices/synth/wav';
import { SITE_IDS } from '@/lib/contract/sites';
import { closeSession } from '@/lib/filing/closeSession';
import { openSession } from '@/lib/filing/openSession';
import { ingestServices } from '@/lib/http/passage';
import { completeRecording } from '@/lib/ingest/completeRecording';
import type { Authorized } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';
import { issueSlot } from '@/lib/upload/issueSlot';
import type { SeedClock, SeededDevice } from './fleetRows';
import type { Random } from './random';

const DAY_MS = 86_400_000;
const MINUTE_MS = 60_000;

export interface Place {
  encounterId: string;
  recordNumber: string;
  ward: string;
  startedAt: number;
  endedAt: number | null;
}

export interface Listener {
  person: Authorized<'session.write'>;
  wards: readonly string[];
}

/** One clip from one device at the clock's time, through slot, storage and completion. */
export async function sendClip(
  services: Services,
  clock: SeedClock,
  from: SeededDevice,
  random: Random,
  more: { site?: string; scannedIdentifier?: string; agesDays?: number },
): Promise<void> {
  if (!from.authenticated) return;
  const seed = random.whole(1, 2 ** 30);
  const rate = from.authenticated.model.sampleRatesHz[0] ?? 4000;
  const recipe = recipeOf(usualRecipe(random.next), seed, rate, random.whole(10, 15));
  const age = more.agesDays ?? 60;
  if (from.drift === 'noisy') recipe.noise *= 1 + Math.max(0, 60 - age) ** 1.35 * 0.02;
  if (from.drift === 'deaf') recipe.gain *= 10 ** (-Math.max(0, 60 - age) / 60 / 2);
  const bytes = encodeWav([synthesise(recipe, seed)], { sampleRateHz: rate, bitDepth: 16 });
  const at = clock.now();
  const offset = random.whole(-3000, 3000);
  const slot = await issueSlot(services, from.authenticated, {
    recordingNumber: `H-${at.toString(36)}-${seed.toString(36)}`,
    sha256: createHash('sha256').update(bytes).digest('hex'),
    bytes: bytes.length,
    mediaType: 'audio/wav',
    recordedAt: at - 17_000 + offset,
    deviceTime: at + offset,
    site: (more.site ?? random.pick(SITE_IDS)) as (typeof SITE_IDS)[number],
    chestpieceSide: random.chance(0.7) ? 'diaphragm' : 'bell',
    gainStep: random.whole(-2, 2),
    ...(more.scannedIdentifier ? { scannedIdentifier: more.scannedIdentifier } : {}),
  });
  const [row] = await services.read
    .select({ slotKey: recording.slotKey })
    .from(recording)
    .where(eq(recording.number, slot.recording))
    .limit(1);
  if (!row) throw new Error('a slot without a recording');
  await services.storage.put({ key: row.slotKey, body: bytes, contentType: 'audio/wav' });
  clock.set(at + random.whole(400, 1500));
  await completeRecording(ingestServices(services), from.authenticated, slot.recording);
  await services.write(async (tx) => {
    await tx
      .update(device)
      .set({ lastHeardAt: clock.now(), batteryPercent: random.whole(20, 100) })
      .where(eq(device.id, from.id));
  });
}

/** A visit: a session of some clips at one patient, or now and then a stray clip without one. */
export async function visit(
  services: Services,
  clock: SeedClock,
  from: SeededDevice,
  place: Place | null,
  listener: Listener | null,
  random: Random,
  agesDays: number,
  leaveOpen = false,
): Promise<number> {
  if (!place || !listener) {
    await sendClip(services, clock, from, random, { agesDays });
    return 1;
  }
  if (random.chance(0.12)) {
    await sendClip(services, clock, from, random, { agesDays, scannedIdentifier: place.recordNumber });
    return 1;
  }
  const session = await openSession(services, listener.person, {
    encounterId: place.encounterId,
    device: from.assetTag,
    takeOver: true,
  });
  const clips = random.whole(3, 6);
  for (let i = 0; i < clips; i++) {
    clock.set(clock.now() + random.whole(22_000, 70_000));
    await sendClip(services, clock, from, random, {
      agesDays,
      ...(SITE_IDS[i] ? { site: SITE_IDS[i] } : {}),
    });
  }
  clock.set(clock.now() + 20_000);
  if (!leaveOpen) await closeSession(services, listener.person, session.id);
  return clips;
}

export { DAY_MS, MINUTE_MS };
