import { otherEncounters } from '@/db/queries/encounters';
import { clipsOfEncounter } from '@/db/queries/recordings';
import { sessionsOfEncounter } from '@/db/queries/sessions';
import type { Services } from '@/lib/platform/services';
import { type ClipLine, lineOf } from './clipLine';

export interface EncounterContents {
  clips: ClipLine[];
  sessions: Awaited<ReturnType<typeof sessionsOfEncounter>>;
  /** The patient's other encounters, the latest first. */
  others: Awaited<ReturnType<typeof otherEncounters>>;
}

/** What an encounter holds. The caller has checked that the person may see the patient. */
export async function readEncounterContents(
  services: Pick<Services, 'read'>,
  of: { id: string; patientId: string },
): Promise<EncounterContents> {
  const [clips, sessions, others] = await Promise.all([
    clipsOfEncounter(services.read, of.id),
    sessionsOfEncounter(services.read, of.id),
    otherEncounters(services.read, of),
  ]);
  return { clips: clips.map(lineOf), sessions, others };
}
