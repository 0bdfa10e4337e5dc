import { getServices } from '@/lib/http/services';
import { currentSigningKey, publicKeySet } from '@/lib/keys/signingKeys';

export const dynamic = 'force-dynamic';

/** Public halves of the keys that device tokens are signed with (RFC 7517). */
export async function GET(): Promise<Response> {
  const services = await getServices();
  await currentSigningKey(services, 'device-token');
  return Response.json(await publicKeySet(services), {
    headers: { 'content-type': 'application/jwk-set+json', 'cache-control': 'public, max-age=300' },
  });
}
