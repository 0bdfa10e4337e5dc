import type { Readable } from 'node:stream';
import { and, eq } from 'drizzle-orm';
import { evidenceRequest, recording } from '@/db/schema';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { appendEntries } from '../append';
import type { HeadSigner } from '../heads/makeHead';
import { packageFiles } from './files';
import { gatherEvidence } from './gather';
import { zipPackage } from './zip';

export interface TakenEvidence {
  /** Name of the archive. */
  filename: string;
  body: Readable;
  manifestSha256: string;
}

/**
 * Make the package that was asked for and is open, for the one who asked. That it was made is an entry, with the hash
 * of its manifest, written before the first byte goes out: whoever gets a package later can be told whether Bellkeep
 * made it.
 *
 * @throws Refusal `not-found`, `not-possible` where it is not decided, was refused, or the original is not in storage
 */
export async function takeEvidence(
  services: Pick<Services, 'read' | 'write' | 'clock' | 'env' | 'storage'>,
  signer: HeadSigner,
  person: Authorized<'evidence.make'>,
  requestId: string,
): Promise<TakenEvidence> {
  const [found] = await services.read
    .select({ request: evidenceRequest, number: recording.number })
    .from(evidenceRequest)
    .innerJoin(recording, eq(recording.id, evidenceRequest.recordingId))
    .where(and(eq(evidenceRequest.id, requestId), eq(evidenceRequest.askedBy, person.id)))
    .limit(1);
  if (!found) throw new Refusal('not-found');
  const { request, number } = found;
  if (request.decision === null) throw new Refusal('not-possible', 'A second person has not decided yet.');
  if (request.decision === 'refused') throw new Refusal('not-possible', 'A second person refused it.');
  const now = services.clock.now();
  const evidence = await gatherEvidence(services, signer, number);
  const kept = await services.storage.head(evidence.original.key);
  if (!kept)
    throw new Refusal('not-possible', 'The original is not in storage. Run the custody audit at once.');
  const packed = await packageFiles(services, evidence, {
    madeAt: new Date(now).toISOString(),
    madeBy: person.name,
    reason: request.reason,
  });
  await services.write(async (tx) => {
    await appendEntries(tx, now, [
      {
        kind: 'exported',
        actor: personActor(person, 'evidence.make'),
        subjects: [{ kind: 'recording', id: request.recordingId }],
        detail: {
          number,
          what: 'evidence',
          request: request.id,
          reason: request.reason,
          treeSize: evidence.heads.at(-1)?.size ?? 0,
          manifestSha256: packed.manifestSha256,
        },
      },
    ]);
  });
  return {
    filename: `${packed.folder}.zip`,
    body: zipPackage(services, packed, evidence.original.key, now),
    manifestSha256: packed.manifestSha256,
  };
}
