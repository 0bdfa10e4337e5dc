import { and, eq, isNull } from 'drizzle-orm';
import { z } from 'zod';
import { outbox, personRole, user } from '@/db/schema';
import type { Role } from '@/lib/identity/permissions';
import type { Handler } from '@/lib/platform/outbox';
import type { Services } from '@/lib/platform/services';

const Alarm = z.object({
  noticeId: z.string(),
  deviceId: z.string(),
  assetTag: z.string(),
  label: z.string(),
});
const Lost = z.object({
  noticeId: z.string(),
  deviceId: z.string(),
  assetTag: z.string(),
  sentSince: z.number(),
});

/** One message to everybody with a role. Put in the outbox under names of their own, so that twice is once. */
async function tell(
  services: Services,
  id: string,
  role: Role,
  subject: string,
  lines: string[],
): Promise<void> {
  const people = await services.read
    .select({ id: user.id, email: user.email })
    .from(user)
    .innerJoin(personRole, eq(personRole.personId, user.id))
    .where(and(eq(personRole.role, role), isNull(user.leftAt)));
  const now = services.clock.now();
  const text = [...lines, '', `Bellkeep, ${services.env.BELLKEEP_HOSPITAL}`].join('\n');
  await services.write(async (tx) => {
    for (const person of people)
      await tx
        .insert(outbox)
        .values({
          id: `${id}-${person.id}`,
          kind: 'mail',
          payload: { to: person.email, subject, text },
          createdAt: now,
          dueAt: now,
        })
        .onConflictDoNothing();
  });
}

/** What the outbox does for alarms: the mail to those who must know. */
export function noticeWork(services: Services): Record<string, Handler> {
  const origin = services.env.BELLKEEP_ORIGIN;
  return {
    'credential-alarm': async (payload) => {
      const { noticeId, deviceId, assetTag, label } = Alarm.parse(payload);
      await tell(services, noticeId, 'itadmin', `An ended credential of ${assetTag} was used`, [
        `The credential ${label} of ${assetTag} was used after it had ended. Somebody may have a copy of it, or the`,
        'device woke from an old state. Every credential of its family is quarantined, and the device must be enrolled',
        'again.',
        '',
        `${origin}/devices/${deviceId}`,
      ]);
    },
    'device-lost': async (payload) => {
      const { noticeId, deviceId, assetTag, sentSince } = Lost.parse(payload);
      await tell(services, noticeId, 'biomed', `${assetTag} is reported lost`, [
        `${assetTag} is reported lost. Its credentials are revoked and its listening session has ended. It sent`,
        `${sentSince} ${sentSince === 1 ? 'recording' : 'recordings'} since it was last surely in hand.`,
        '',
        `${origin}/devices/${deviceId}`,
      ]);
    },
  };
}
