import { eq, inArray } from 'drizzle-orm';
import { z } from 'zod';
import { personWard, ward } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { findPerson } from './findPerson';

const Ids = z
  .array(z.string().min(1).max(100))
  .max(200)
  .transform((ids) => [...new Set(ids)].sort());

export const WardChange = z.strictObject({
  /** The wards as whoever sends this saw them. */
  before: Ids,
  after: Ids,
});

/** @throws Refusal `body-invalid` when one of them is not there */
export async function checkWards(tx: Tx, ids: readonly string[]): Promise<{ id: string; name: string }[]> {
  if (ids.length === 0) return [];
  const found = await tx
    .select({ id: ward.id, name: ward.name })
    .from(ward)
    .where(inArray(ward.id, [...ids]))
    .orderBy(ward.name);
  if (found.length !== new Set(ids).size)
    throw new Refusal('body-invalid', 'There is no such ward.', {
      errors: [{ path: 'wardIds', message: 'no such ward' }],
    });
  return found;
}

/**
 * Say on which wards a person works. It holds from their next request on.
 *
 * @throws Refusal `not-found`, `stale`, `body-invalid`
 */
export async function setWards(
  services: Pick<Services, 'write' | 'clock'>,
  by: Authorized<'people.write'>,
  personId: string,
  change: z.infer<typeof WardChange>,
  remember?: (tx: Tx, answer: { wardIds: string[] }) => Promise<void>,
): Promise<{ wardIds: string[] }> {
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const person = await findPerson(tx, personId);
    const held = await tx
      .select({ id: ward.id, name: ward.name })
      .from(personWard)
      .innerJoin(ward, eq(ward.id, personWard.wardId))
      .where(eq(personWard.personId, personId))
      .orderBy(ward.name);
    const heldIds = held.map((row) => row.id).sort();
    if (heldIds.join() !== change.before.join())
      throw new Refusal('stale', `Somebody changed the wards of ${person.name} in the meantime.`, {
        wardIds: heldIds,
      });
    const wanted = await checkWards(tx, change.after);
    const answer = { wardIds: change.after };
    if (heldIds.join() !== change.after.join()) {
      await tx.delete(personWard).where(eq(personWard.personId, personId));
      if (wanted.length > 0)
        await tx.insert(personWard).values(wanted.map((row) => ({ personId, wardId: row.id })));
      await appendEntries(tx, now, [
        {
          kind: 'wards-changed',
          actor: personActor(by, 'people.write'),
          subjects: [{ kind: 'person', id: personId }],
          before: { wards: held.map((row) => row.name) },
          after: { wards: wanted.map((row) => row.name) },
        },
      ]);
    }
    await remember?.(tx, answer);
    return answer;
  });
}
