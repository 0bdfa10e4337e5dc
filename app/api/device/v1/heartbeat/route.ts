import { HeartbeatRequest } from '@/lib/contract/device';
import { heartbeat } from '@/lib/credentials/heartbeat';
import { deviceRoute } from '@/lib/http/device';

/** The device says how it is and hears the time. */
export const POST = deviceRoute({ body: HeartbeatRequest }, async ({ device, body, services }) =>
  Response.json(await heartbeat(services, device, body)),
);
