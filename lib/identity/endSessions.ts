import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { type Authorized, personActor } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';
import { findPerson } from './findPerson';
import { deleteSessions } from './sessions';

/** End all sessions of a person at once, everywhere. @throws Refusal `not-found` */
export async function endSessions(
  services: Pick<Services, 'write' | 'clock'>,
  by: Authorized<'people.write'>,
  personId: string,
  remember?: (tx: Tx, answer: { ended: number }) => Promise<void>,
): Promise<{ ended: number }> {
  return await services.write(async (tx) => {
    const person = await findPerson(tx, personId);
    const answer = { ended: await deleteSessions(tx, personId) };
    await appendEntries(tx, services.clock.now(), [
      {
        kind: 'sessions-ended',
        actor: personActor(by, 'people.write'),
        subjects: [{ kind: 'person', id: personId }],
        detail: { name: person.name, count: answer.ended },
      },
    ]);
    await remember?.(tx, answer);
    return answer;
  });
}
