import { and, eq, or } from 'drizzle-orm';
import { z } from 'zod';
import { device, deviceModel, ward } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import type { Actor } from '@/lib/custody/entry';
import { Refusal } from '@/lib/platform/errors';
import { newId } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';

const word = (max: number) =>
  z
    .string()
    .trim()
    .min(1)
    .max(max)
    .regex(/^[^\p{C}]*$/u, 'no control characters');

export const NewDevice = z.strictObject({
  assetTag: word(32).regex(/^[A-Za-z0-9][A-Za-z0-9./-]*$/, 'letters, digits, hyphens, dots and slashes'),
  serialNumber: word(64),
  modelId: z.string(),
  wardId: z.string().nullable(),
  udi: word(200).nullable(),
  lot: word(64).nullable(),
  firmware: word(64).nullable(),
});
export type NewDevice = z.infer<typeof NewDevice>;

/** Put one device on the list, waiting for its enrolment, in the caller's transaction. @returns its id */
export async function insertDevice(tx: Tx, by: Actor, wanted: NewDevice, now: number): Promise<string> {
  const [model] = await tx.select().from(deviceModel).where(eq(deviceModel.id, wanted.modelId)).limit(1);
  if (!model)
    throw new Refusal('body-invalid', 'There is no such model.', {
      errors: [{ path: 'modelId', message: 'no such model' }],
    });
  if (wanted.wardId !== null) {
    const [found] = await tx.select({ id: ward.id }).from(ward).where(eq(ward.id, wanted.wardId)).limit(1);
    if (!found)
      throw new Refusal('body-invalid', 'There is no such ward.', {
        errors: [{ path: 'wardId', message: 'no such ward' }],
      });
  }
  const [taken] = await tx
    .select({ assetTag: device.assetTag, serialNumber: device.serialNumber })
    .from(device)
    .where(
      or(
        eq(device.assetTag, wanted.assetTag),
        and(eq(device.modelId, wanted.modelId), eq(device.serialNumber, wanted.serialNumber)),
      ),
    )
    .limit(1);
  if (taken) {
    const path = taken.assetTag === wanted.assetTag ? 'assetTag' : 'serialNumber';
    throw new Refusal(
      'body-invalid',
      `${taken.assetTag} (serial ${taken.serialNumber}) is on the list already.`,
      {
        errors: [{ path, message: `on the list already, as ${taken.assetTag}` }],
      },
    );
  }
  const id = newId();
  await tx.insert(device).values({ id, ...wanted, state: 'waiting', createdAt: now });
  await appendEntries(tx, now, [
    {
      kind: 'device-added',
      actor: by,
      subjects: [
        { kind: 'device', id },
        { kind: 'model', id: model.id },
      ],
      after: { ...wanted, model: model.name, state: 'waiting' },
    },
  ]);
  return id;
}

/**
 * Put one device on the list, waiting for its enrolment.
 *
 * @throws Refusal `body-invalid` naming the field that is taken or unknown
 */
export const addDevice = (
  services: Pick<Services, 'write' | 'clock'>,
  by: Actor,
  wanted: NewDevice,
): Promise<string> => services.write((tx) => insertDevice(tx, by, wanted, services.clock.now()));
