import { Readable } from 'node:stream';
import yazl from 'yazl';
import type { Services } from '@/lib/platform/services';
import type { PackageFiles } from './files';

/**
 * The package as an archive, streamed: the original passes through piece by piece. An original whose bytes end early
 * ends the archive with an error, so that nobody takes half a package for a whole one.
 *
 * @param originalKey where the original lies in storage
 */
export function zipPackage(
  services: Pick<Services, 'storage'>,
  packed: PackageFiles,
  originalKey: string,
  madeAtMs: number,
): Readable {
  const zip = new yazl.ZipFile();
  const out = zip.outputStream as Readable;
  const mtime = new Date(madeAtMs);
  const name = (path: string) => `${packed.folder}/${path}`;
  for (const { path, body } of packed.files) zip.addBuffer(body, name(path), { mtime });
  zip.addReadStreamLazy(name(packed.originalPath), { mtime }, (give) => {
    services.storage.getStream(originalKey).then(
      ({ body }) => {
        const stream = Readable.from(body);
        stream.once('error', (error) => out.destroy(error));
        give(null, stream);
      },
      (error: unknown) => out.destroy(error instanceof Error ? error : new Error(String(error))),
    );
  });
  zip.on('error', (error: Error) => out.destroy(error));
  zip.end();
  return out;
}
