import type { ThreadEntry } from '@/lib/custody/readThread';
import { may } from '@/lib/identity/permissions';
import type { Person } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';
import { maySeePatient } from '@/lib/records/patientAccess';
import type { Batch } from './logTail';

/** How long an answer about a patient holds in one stream: somebody moved in or out is heard of soon enough. */
const REMEMBERED_MS = 30_000;
const MOST_REMEMBERED = 2_000;

type Subject = ThreadEntry['entry']['subjects'][number];

/**
 * Which subjects of an entry this person may hear of: the names of things, never what happened to them. A patient's
 * things are heard of by whom they may be seen.
 */
export function audibleTo(services: Pick<Services, 'read' | 'clock'>, person: Person) {
  const sees = patientMemory(services, person);
  const has = {
    ledger: may(person.roles, 'ledger.read'),
    recordings: may(person.roles, 'recording.read'),
    fleet: may(person.roles, 'fleet.read'),
    device: may(person.roles, 'device.read'),
    credentials: may(person.roles, 'credential.read'),
    people: may(person.roles, 'people.read'),
  };

  async function hears(subject: Subject, batch: Batch): Promise<boolean> {
    switch (subject.kind) {
      case 'patient':
        return has.recordings && (has.ledger || (await sees(subject.id)));
      case 'encounter':
      case 'session':
      case 'recording': {
        if (has.ledger || (subject.kind === 'recording' && has.fleet)) return true;
        const place = has.recordings ? batch.placeOf(subject.kind, subject.id) : undefined;
        if (!place) return false;
        if (place.patientId !== null) return await sees(place.patientId);
        return place.trayWardId === null || person.wardIds.includes(place.trayWardId);
      }
      case 'device':
      case 'model':
        return has.device;
      case 'credential':
      case 'signing-key':
      case 'rotation':
        return has.credentials;
      case 'person':
      case 'invitation':
        return has.people || has.ledger;
      case 'connection':
      case 'client':
      case 'webhook':
        return has.credentials;
      case 'policy':
        return true;
    }
  }

  return async ({ entry }: ThreadEntry, batch: Batch): Promise<Subject[]> => {
    const heard: Subject[] = [];
    for (const subject of entry.subjects) if (await hears(subject, batch)) heard.push(subject);
    return heard;
  };
}

function patientMemory(services: Pick<Services, 'read' | 'clock'>, person: Person) {
  const known = new Map<string, { answer: Promise<boolean>; until: number }>();
  return (patientId: string): Promise<boolean> => {
    const now = services.clock.now();
    const before = known.get(patientId);
    if (before && before.until > now) return before.answer;
    if (known.size >= MOST_REMEMBERED) known.clear();
    const answer = maySeePatient(services, person, patientId);
    known.set(patientId, { answer, until: now + REMEMBERED_MS });
    answer.catch(() => known.delete(patientId));
    return answer;
  };
}
