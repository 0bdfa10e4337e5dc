import { z } from 'zod';
import { webhook } from '@/db/schema';
import type { Tx } from '@/db/write';
import { EVENT_TYPES } from '@/lib/contract/events';
import { appendEntries } from '@/lib/custody/append';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import { newId, newSecret } from '@/lib/platform/ids';
import { OutsideError, parseOutsideUrl, type Resolve, resolveOutside } from '@/lib/platform/outside';
import type { Services } from '@/lib/platform/services';
import { secretBox } from './deliver';

export const NewWebhook = z.strictObject({
  name: z
    .string()
    .trim()
    .min(1, 'A name is needed.')
    .max(80)
    .regex(/^[^\p{C}]*$/u, 'It holds characters that cannot be seen.'),
  url: z.string().trim().max(1000),
  events: z
    .array(z.enum(EVENT_TYPES))
    .min(1, 'Choose at least one.')
    .transform((events) => EVENT_TYPES.filter((event) => events.includes(event))),
});
export type NewWebhook = z.infer<typeof NewWebhook>;

export interface AddedWebhook {
  id: string;
  /** Shown in this answer alone; null in the answer to a repeat. */
  secret: string | null;
}

/**
 * Tell another system what happens from now on. An address that leads inside is refused here, and again at each delivery.
 *
 * @throws Refusal `body-invalid`
 */
export async function addWebhook(
  services: Pick<Services, 'write' | 'clock' | 'env' | 'secrets'>,
  by: Authorized<'connections.write'>,
  wanted: NewWebhook,
  remember?: (tx: Tx, answer: AddedWebhook) => Promise<void>,
  resolve?: Resolve,
): Promise<AddedWebhook> {
  try {
    await resolveOutside(parseOutsideUrl(wanted.url), services.env, resolve);
  } catch (error) {
    if (!(error instanceof OutsideError)) throw error;
    throw new Refusal('body-invalid', error.message, { errors: [{ path: 'url', message: error.message }] });
  }
  const now = services.clock.now();
  const id = newId();
  const secret = newSecret();
  return await services.write(async (tx) => {
    await tx.insert(webhook).values({
      id,
      ...wanted,
      sealedSecret: services.secrets.seal(secret, secretBox(id)),
      createdBy: by.id,
      createdAt: now,
    });
    await appendEntries(tx, now, [
      {
        kind: 'webhook-added',
        actor: personActor(by, 'connections.write'),
        subjects: [{ kind: 'webhook', id }],
        detail: { name: wanted.name, host: new URL(wanted.url).host, events: wanted.events },
      },
    ]);
    // What a repeat is answered is kept: never a secret.
    await remember?.(tx, { id, secret: null });
    return { id, secret };
  });
}
