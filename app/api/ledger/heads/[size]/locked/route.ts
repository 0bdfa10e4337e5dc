import { headOf } from '@/lib/custody/heads/makeHead';
import { lockedHead } from '@/lib/custody/heads/storeHead';
import { personRoute } from '@/lib/http/person';
import { fromStorage } from '@/lib/http/stream';
import { Refusal } from '@/lib/platform/errors';

/** A head as it lies under lock in storage, and until when; nobody's database has a say in it. */
export const GET = personRoute('GET /api/ledger/heads/[size]/locked', {}, async ({ params, services }) => {
  const size = Number(params.size);
  const head = Number.isSafeInteger(size) ? await headOf(services, size) : null;
  const found = head && (await fromStorage(() => lockedHead(services, head)));
  if (!found) throw new Refusal('not-found', 'No such head lies in storage, or not yet.');
  return Response.json(found);
});
