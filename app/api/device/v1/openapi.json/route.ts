import { deviceApiDocument } from '@/lib/contract/openapi';
import { publicRoute } from '@/lib/http/person';

/** The device API as an OpenAPI 3.1 document. */
export const GET = publicRoute('GET /api/device/v1/openapi.json', {}, async ({ services }) =>
  Response.json(deviceApiDocument(services.env.BELLKEEP_ORIGIN), {
    headers: { 'cache-control': 'public, max-age=300' },
  }),
);
