import { applyMigrations } from '@/db/migrate';
import { bringTreeUp } from '@/lib/custody/tree/grow';
import { endForgottenSessions } from '@/lib/filing/endForgottenSessions';
import { forgetExpired } from '@/lib/identity/forgetExpired';
import { sweepRecordings } from '@/lib/ingest/sweep';
import { currentSigningKey } from '@/lib/keys/signingKeys';
import { Message } from '@/lib/mail/port';
import { startOutbox } from '@/lib/platform/outbox';
import { beat, beginPulse } from '@/lib/platform/pulse';
import { DELIVERY } from '@/lib/webhooks/fanOut';
import { forgetDeliveries } from '@/lib/webhooks/forgetDeliveries';
import { recordPeerAddresses } from './clientAddress';
import { noticeWork } from './notices';
import { ingestServices } from './passage';
import { startRotation } from './rotation';
import { getServices } from './services';
import { headWork, startHeads } from './treeHeads';
import { startWebhooks } from './webhooks';

const SWEEP_EVERY_MS = 30_000;
const TIDY_EVERY_MS = 3_600_000;

/** What one web process does beside answering. All of it may run in several processes at once. */
export async function startProcess(): Promise<void> {
  recordPeerAddresses();
  const services = await getServices();
  beginPulse(services.clock.now());
  await applyMigrations(services.database);
  await bringTreeUp(services);
  await currentSigningKey(services, 'device-token');
  startOutbox(
    services,
    {
      mail: (payload) => services.mail.send(Message.parse(payload)),
      ...headWork(services),
      ...noticeWork(services),
    },
    { except: DELIVERY },
  );
  startWebhooks(services);
  startHeads(services);
  startRotation(services);

  let sweeping = false;
  const sweep = setInterval(async () => {
    if (sweeping) return;
    sweeping = true;
    try {
      const done = await sweepRecordings(ingestServices(services));
      if (done > 0) services.log.info({ done }, 'the sweep carried clips on');
      await endForgottenSessions(services);
      beat('sweep', services.clock.now(), true);
    } catch (error) {
      beat('sweep', services.clock.now(), false);
      services.log.error({ err: error }, 'the sweep failed');
    } finally {
      sweeping = false;
    }
  }, SWEEP_EVERY_MS);
  sweep.unref();
  const tidy = () =>
    Promise.all([forgetExpired(services), forgetDeliveries(services)]).catch((error: unknown) =>
      services.log.error({ err: error }, 'what has ended could not be removed'),
    );
  setInterval(tidy, TIDY_EVERY_MS).unref();
  services.log.info({ origin: services.env.BELLKEEP_ORIGIN }, 'Bellkeep is up');
}
