import { z } from 'zod';
import { deviceModel } from '@/db/schema';
import { isUniqueViolation } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import type { Actor } from '@/lib/custody/entry';
import { Refusal } from '@/lib/platform/errors';
import { newId } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';

/** What a model's recordings should be. Rates in Hz, lengths in seconds. */
export const ModelDescription = z.strictObject({
  maker: z.string().trim().min(1).max(80),
  name: z.string().trim().min(1).max(80),
  /** Empty: any rate is taken. */
  sampleRatesHz: z.array(z.number().min(500).max(192_000)).max(16),
  bitDepths: z.array(z.number().int().min(8).max(64)).max(8),
  mediaTypes: z
    .array(z.string().regex(/^[a-z]+\/[a-z0-9.+-]+$/))
    .min(1)
    .max(16),
  allowLossy: z.boolean(),
  longestClipSeconds: z.number().min(1).max(86_400),
  fullScaleNote: z.string().trim().max(400).nullable(),
  checkIntervalDays: z.number().int().min(1).max(3650),
  signsRequests: z.boolean(),
});
export type ModelDescription = z.infer<typeof ModelDescription>;

/**
 * Describe a device model.
 *
 * @returns its id
 * @throws Refusal `not-possible` when a model of that name exists
 */
export async function describeModel(
  services: Pick<Services, 'write' | 'clock'>,
  by: Actor,
  model: ModelDescription,
): Promise<string> {
  const id = newId();
  const now = services.clock.now();
  try {
    await services.write(async (tx) => {
      await tx.insert(deviceModel).values({ id, ...model, createdAt: now });
      await appendEntries(tx, now, [
        { kind: 'model-described', actor: by, subjects: [{ kind: 'model', id }], after: { ...model } },
      ]);
    });
  } catch (error) {
    if (isUniqueViolation(error))
      throw new Refusal('not-possible', `A model named ${model.name} is described already.`);
    throw error;
  }
  return id;
}
