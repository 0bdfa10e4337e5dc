import { and, lt, notExists, sql } from 'drizzle-orm';
import { webhookDelivery } from '@/db/schema';
import type { Services } from '@/lib/platform/services';
import { currentPolicy } from '@/lib/policy/currentPolicy';

/** Remove deliveries that are older than policy lists them for; none that is still on its way. */
export async function forgetDeliveries(services: Pick<Services, 'read' | 'write' | 'clock'>): Promise<void> {
  const { settings } = await currentPolicy(services.read, 'retention');
  const before = services.clock.now() - settings.deliveryDays * 86_400_000;
  await services.write(async (tx) => {
    await tx
      .delete(webhookDelivery)
      .where(
        and(
          lt(webhookDelivery.createdAt, before),
          notExists(
            sql`(select 1 from outbox where outbox.id = ${webhookDelivery.id} and outbox.done_at is null and outbox.dead_at is null)`,
          ),
        ),
      );
  });
}
