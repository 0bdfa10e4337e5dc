import { desc } from 'drizzle-orm';
import { policy } from '@/db/schema';
import { DEFAULT_LIMITS } from '@/lib/acoustics/judge';
import type { JudgingLimits } from '@/lib/acoustics/types';
import type { DeviceModelRow } from '@/lib/keys/device';
import type { Services } from '@/lib/platform/services';

/**
 * The limits by which a clip of this model is judged: the hospital's current policy, with what the model's profile
 * says of rates, types and codecs. A member that a policy does not name keeps its default.
 *
 * @returns limits and the policy's version (0: none was made, the defaults stand)
 */
export async function limitsFor(
  services: Pick<Services, 'read'>,
  model: DeviceModelRow,
): Promise<{ limits: JudgingLimits; version: number }> {
  const [row] = await services.read.select().from(policy).orderBy(desc(policy.version)).limit(1);
  const known = Object.fromEntries(
    Object.entries(row?.limits ?? {}).filter(
      ([name, value]) =>
        name in DEFAULT_LIMITS && typeof value === typeof DEFAULT_LIMITS[name as keyof JudgingLimits],
    ),
  );
  return {
    version: row?.version ?? 0,
    limits: {
      ...DEFAULT_LIMITS,
      ...known,
      expectedSampleRatesHz: model.sampleRatesHz,
      allowedMediaTypes: model.mediaTypes,
      allowLossy: model.allowLossy,
    },
  };
}
