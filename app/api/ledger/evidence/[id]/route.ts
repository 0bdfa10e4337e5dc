import { Readable } from 'node:stream';
import { takeEvidence } from '@/lib/custody/evidence/takeEvidence';
import { personRoute } from '@/lib/http/person';
import { fromStorage } from '@/lib/http/stream';
import { headSigner } from '@/lib/http/treeHeads';

/** The evidence package as an archive, for the one who asked for it. Each download is an entry, written first. */
export const GET = personRoute('GET /api/ledger/evidence/[id]', {}, async ({ person, params, services }) => {
  const signer = await headSigner(services);
  const taken = await fromStorage(() => takeEvidence(services, signer, person, params.id ?? ''));
  return new Response(Readable.toWeb(taken.body) as ReadableStream<Uint8Array>, {
    headers: {
      'content-type': 'application/zip',
      'content-disposition': `attachment; filename="${taken.filename}"`,
    },
  });
});
