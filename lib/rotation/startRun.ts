import { z } from 'zod';
import { rotationMember, rotationRun } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import { newId, readableCode } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';
import { credentialsOf, MOST_MEMBERS, Selection } from './selection';

const HOUR_MS = 3_600_000;
const ROWS_AN_INSERT = 500;

export const NewRun = z.strictObject({
  selection: Selection,
  /** Devices told at once. */
  waveSize: z.number().int().min(1).max(5_000),
  /** Minutes between waves. */
  wavePauseMinutes: z
    .number()
    .min(0)
    .max(7 * 24 * 60),
  deadlineHours: z
    .number()
    .min(1)
    .max(90 * 24),
  atDeadline: z.enum(['keep', 'revoke']),
  reason: z.string().trim().min(5, 'A reason of at least five letters is needed.').max(500),
});
export type NewRun = z.infer<typeof NewRun>;

interface Started {
  id: string;
  label: string;
  members: number;
}

/** How many credentials a selection hits now. */
export async function countSelection(
  services: Pick<Services, 'read' | 'clock'>,
  _by: Authorized<'credential.write'>,
  selection: z.infer<typeof Selection>,
): Promise<{ members: number }> {
  return { members: (await credentialsOf(services.read, selection, services.clock.now())).length };
}

/**
 * Start a rotation run: its members are fixed here, its first wave is told by the next advance. Nothing stops: each
 * old credential works until its successor is used.
 *
 * @throws Refusal `not-possible` for a selection that hits none or too many
 */
export async function startRun(
  services: Pick<Services, 'write' | 'clock'>,
  by: Authorized<'credential.write'>,
  wanted: NewRun,
  remember?: (tx: Tx, answer: Started) => Promise<void>,
): Promise<Started> {
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const members = await credentialsOf(tx, wanted.selection, now);
    if (members.length === 0)
      throw new Refusal('not-possible', 'No living credential is hit, or all are in a run already.');
    if (members.length > MOST_MEMBERS)
      throw new Refusal('not-possible', `More than ${MOST_MEMBERS} are hit: choose fewer.`);
    const code = readableCode(6);
    const run = {
      id: newId(),
      label: `r-${code.slice(0, 4)}-${code.slice(4)}`,
      state: 'running' as const,
      reason: wanted.reason,
      selection: wanted.selection,
      waveSize: wanted.waveSize,
      wavePauseMs: Math.round(wanted.wavePauseMinutes * 60_000),
      nextWaveAt: now,
      deadlineAt: now + Math.round(wanted.deadlineHours * HOUR_MS),
      atDeadline: wanted.atDeadline,
      startedBy: by.id,
      startedAt: now,
    };
    await tx.insert(rotationRun).values(run);
    for (let i = 0; i < members.length; i += ROWS_AN_INSERT) {
      const rows = members.slice(i, i + ROWS_AN_INSERT);
      await tx
        .insert(rotationMember)
        .values(rows.map((row) => ({ ...row, runId: run.id, state: 'waiting' as const })));
    }
    await appendEntries(tx, now, [
      {
        kind: 'rotation-started',
        actor: personActor(by, 'credential.write'),
        subjects: [{ kind: 'rotation', id: run.id }],
        detail: {
          label: run.label,
          members: members.length,
          waveSize: run.waveSize,
          deadlineAt: new Date(run.deadlineAt).toISOString(),
          atDeadline: run.atDeadline,
          reason: run.reason,
        },
      },
    ]);
    const answer = { id: run.id, label: run.label, members: members.length };
    await remember?.(tx, answer);
    return answer;
  });
}
