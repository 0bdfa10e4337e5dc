import type { Sight } from '@/db/queries/sight';
import {
  candidateRows,
  encountersHeardWith,
  encountersNamed,
  encountersOnWard,
  sessionsOfDevice,
} from '@/db/queries/tray';
import type { Services } from '@/lib/platform/services';

export interface Candidate {
  encounterId: string;
  encounterNumber: string;
  patientId: string;
  givenName: string;
  familyName: string;
  recordNumber: string;
  birthDate: string | null;
  ward: string | null;
  bed: string | null;
  /** Why it is suggested, in words, the strongest first. */
  why: string[];
}

export interface StrayClip {
  deviceId: string;
  wardId: string | null;
  ward: string | null;
  /** UTC milliseconds. */
  recordedAt: number;
  scannedIdentifier: string | null;
}

const NEAR_MS = 30 * 60_000;
const SAME_ROUND_MS = 12 * 3_600_000;
const LATELY_MS = 14 * 86_400_000;
const MOST = 5;
/** Of those who were merely on the ward: a longer list would only be leafed through. */
const MOST_OF_WARD = 3;
/** From here on a reason is more than having been on the ward. */
const STRONG = 10;

interface Reason {
  encounterId: string;
  weight: number;
  words: string;
}

/**
 * Encounters that a stray clip may belong to, the likeliest first, each with why: the scanned identifier, then sessions
 * of the same device close in time, then whom the device was with lately, then who was on the device's ward. The
 * weights only order; they are ours and shown to nobody. Nothing is filed by this: a person reads two identifiers first.
 *
 * @param sight encounters that the person does not see are not suggested
 */
export async function candidatesFor(
  services: Pick<Services, 'read'>,
  clip: StrayClip,
  sight: Sight,
): Promise<Candidate[]> {
  const reasons = [
    ...(await byScan(services, clip)),
    ...(await bySession(services, clip)),
    ...(await byWard(services, clip)),
  ];
  const ranked = new Map<string, { weight: number; why: string[] }>();
  for (const { encounterId, weight, words } of reasons.sort((a, b) => b.weight - a.weight)) {
    const before = ranked.get(encounterId) ?? { weight: 0, why: [] };
    ranked.set(encounterId, { weight: before.weight + weight, why: [...before.why, words] });
  }
  const rows = await candidateRows(services.read, sight, [...ranked.keys()]);
  const found = rows
    .map(({ startedAt, ...row }) => ({
      row,
      startedAt,
      ...(ranked.get(row.encounterId) ?? { weight: 0, why: [] }),
    }))
    .sort((a, b) => b.weight - a.weight || b.startedAt - a.startedAt);
  const strong = found.filter(({ weight }) => weight >= STRONG);
  const weak = found.filter(({ weight }) => weight < STRONG).slice(0, MOST_OF_WARD);
  return [...strong, ...weak].slice(0, MOST).map(({ row, why }) => ({ ...row, why }));
}

async function byScan(services: Pick<Services, 'read'>, clip: StrayClip): Promise<Reason[]> {
  const scanned = clip.scannedIdentifier;
  if (scanned === null) return [];
  const named = await encountersNamed(services.read, scanned);
  return named
    .filter(({ status }) => status !== 'cancelled')
    .map(({ id, startedAt, endedAt }) => {
      const ran = startedAt <= clip.recordedAt && (endedAt === null || endedAt >= clip.recordedAt);
      return {
        encounterId: id,
        weight: ran ? 100 : 40,
        words: ran
          ? `“${scanned}” was scanned with the clip`
          : `“${scanned}” was scanned, though this encounter ${startedAt > clip.recordedAt ? 'began later' : 'had ended by then'}`,
      };
    });
}

async function bySession(services: Pick<Services, 'read'>, clip: StrayClip): Promise<Reason[]> {
  const at = clip.recordedAt;
  const sessions = await sessionsOfDevice(services.read, clip.deviceId, at - SAME_ROUND_MS, at + NEAR_MS);
  return sessions.map(({ encounterId, number, openedAt, closedAt }) => {
    const session = `session ${number} with this device`;
    if (openedAt > at)
      return { encounterId, weight: 60, words: `${session} began ${minutes(openedAt - at)} later` };
    if (closedAt === null || closedAt >= at) return { encounterId, weight: 80, words: `${session} was open` };
    if (at - closedAt <= NEAR_MS)
      return { encounterId, weight: 70, words: `${session} had ended ${minutes(at - closedAt)} before` };
    return { encounterId, weight: 20, words: 'this device was with the patient earlier that day' };
  });
}

async function byWard(services: Pick<Services, 'read'>, clip: StrayClip): Promise<Reason[]> {
  if (clip.wardId === null) return [];
  const [here, heard] = await Promise.all([
    encountersOnWard(services.read, clip.wardId, clip.recordedAt),
    encountersHeardWith(services.read, clip.deviceId, clip.recordedAt - LATELY_MS, clip.recordedAt),
  ]);
  const heardAt = new Map(heard.map((row) => [row.encounterId, row.at]));
  return here.flatMap(({ id }): Reason[] => {
    const last = heardAt.get(id);
    const onWard = {
      encounterId: id,
      weight: 5,
      words: `in ${clip.ward ?? 'the ward'} then, where the device belongs`,
    };
    if (last === undefined) return [onWard];
    const days = Math.round((clip.recordedAt - last) / 86_400_000);
    const when = days === 0 ? 'the same day' : days === 1 ? 'the day before' : `${days} days before`;
    return [
      { encounterId: id, weight: 15 - Math.min(9, days), words: `this device recorded the patient ${when}` },
      onWard,
    ];
  });
}

const minutes = (ms: number): string => `${Math.max(1, Math.round(ms / 60_000))} min`;
