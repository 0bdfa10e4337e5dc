import { EnrolRequest } from '@/lib/contract/device';
import { enrolDevice } from '@/lib/enrolment/enrolDevice';
import { openDeviceRoute } from '@/lib/http/device';

/** Exchange a one-time code and a public key for the device's first credential. */
export const POST = openDeviceRoute({ body: EnrolRequest }, async ({ body, services }) => {
  const { answer, repeated } = await enrolDevice(services, body);
  return Response.json(answer, { status: repeated ? 200 : 201 });
});
