import { verifierLines } from '@/lib/custody/heads/headKeys';
import { getServices } from '@/lib/http/services';
import { headSigner } from '@/lib/http/treeHeads';

export const dynamic = 'force-dynamic';

/** Public keys of the custody log's heads, one verifier key string (C2SP signed-note) a line, the present one last. */
export async function GET(): Promise<Response> {
  const services = await getServices();
  await headSigner(services);
  return new Response(`${(await verifierLines(services)).join('\n')}\n`, {
    headers: { 'content-type': 'text/plain; charset=utf-8', 'cache-control': 'public, max-age=300' },
  });
}
