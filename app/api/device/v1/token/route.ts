import { RenewRequest } from '@/lib/contract/device';
import { renewCredential } from '@/lib/credentials/renewCredential';
import { deviceRoute } from '@/lib/http/device';

/** Renew the credential that this call is made with. */
export const POST = deviceRoute({ body: RenewRequest, renewing: true }, async ({ device, services }) => {
  const { answer, repeated } = await renewCredential(services, device);
  return Response.json(answer, { status: repeated ? 200 : 201 });
});
