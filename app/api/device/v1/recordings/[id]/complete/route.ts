import { CompleteRequest } from '@/lib/contract/device';
import { deviceRoute } from '@/lib/http/device';
import { ingestServices } from '@/lib/http/passage';
import { completeRecording } from '@/lib/ingest/completeRecording';

/** The bytes are put: seal, measure, judge, file, and answer with the verdict and its reasons. */
export const POST = deviceRoute({ body: CompleteRequest }, async ({ device, services, params }) =>
  Response.json(await completeRecording(ingestServices(services), device, params.id ?? '')),
);
