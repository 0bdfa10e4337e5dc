import { SlotRequest } from '@/lib/contract/device';
import { deviceRoute } from '@/lib/http/device';
import { issueSlot } from '@/lib/upload/issueSlot';

/** Admit one recording: a presigned PUT that takes exactly these bytes, for five minutes. */
export const POST = deviceRoute({ body: SlotRequest }, async ({ device, body, services }) => {
  const slot = await issueSlot(services, device, body);
  return Response.json(slot, { status: slot.repeated ? 200 : 201 });
});
