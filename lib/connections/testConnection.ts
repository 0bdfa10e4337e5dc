import { connectionCheck } from '@/db/schema';
import { appendEntries } from '@/lib/custody/append';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import type { CheckStep } from '@/lib/storage/port';
import { CONNECTIONS, type ConnectionKind, TESTS } from './tests';

const isConnection = (kind: string): kind is ConnectionKind =>
  (CONNECTIONS as readonly string[]).includes(kind);

/**
 * Test a connection by doing the real thing, and keep what came of it. If the process dies before the result is
 * written, the test happened and nothing says so: it is pressed again.
 *
 * @throws Refusal `not-found` for an unknown connection
 */
export async function testConnection(
  services: Pick<Services, 'read' | 'write' | 'storage' | 'mail' | 'env' | 'secrets' | 'clock'>,
  by: Authorized<'connections.write'>,
  kind: string,
): Promise<{ ok: boolean; steps: CheckStep[]; checkedAt: number }> {
  if (!isConnection(kind)) throw new Refusal('not-found');
  const steps = await TESTS[kind](services, by);
  const ok = steps.every((step) => step.ok);
  const checkedAt = services.clock.now();
  await services.write(async (tx) => {
    const row = { ok, steps, checkedBy: by.id, checkedAt };
    await tx
      .insert(connectionCheck)
      .values({ kind, ...row })
      .onConflictDoUpdate({ target: connectionCheck.kind, set: row });
    const failed = steps.find((step) => !step.ok);
    await appendEntries(tx, checkedAt, [
      {
        kind: 'connection-tested',
        actor: personActor(by, 'connections.write'),
        subjects: [{ kind: 'connection', id: kind }],
        detail: { connection: kind, ok, ...(failed ? { failed: failed.name, why: failed.detail } : {}) },
      },
    ]);
  });
  return { ok, steps, checkedAt };
}
