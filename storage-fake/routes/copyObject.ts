import { answerXml } from '../answer';
import {
  CHECKSUM_NAMES,
  type ChecksumName,
  type Checksums,
  checksumElement,
  Digests,
  isChecksumName,
} from '../checksums';
import { checkReadConditions } from '../conditions';
import { describeFrom, isoDate, quoted } from '../describe';
import { preconditionFailed, S3Error } from '../errors';
import type { BucketExchange, KeyExchange } from '../exchange';
import type { ObjectRecord } from '../objects';
import { percentDecode, textOf } from '../wire';
import { assertMayWrite } from './putObject';
import { writerOf } from './receiveBlob';

const PIECE = 1024 * 1024;

/**
 * The object named by `x-amz-copy-source`, open, its conditions checked.
 *
 * @throws S3Error NoSuchKey, NoSuchBucket, PreconditionFailed
 */
export async function openSource(exchange: BucketExchange) {
  const source = exchange.request.header('x-amz-copy-source') ?? '';
  const [path, query] = source.replace(/^\//, '').split('?versionId=', 2) as [string, string?];
  const name = textOf(percentDecode(path));
  const slash = name.indexOf('/');
  if (slash <= 0 || slash === name.length - 1) {
    throw new S3Error(
      'InvalidArgument',
      'Copy Source must mention the source bucket and key: sourcebucket/sourcekey',
    );
  }
  if (query !== undefined && query !== 'null')
    throw new S3Error('NoSuchVersion', 'The specified version does not exist.');
  const bucket = exchange.store.bucket(name.slice(0, slash));
  const opened = await exchange.store.openObject(bucket, name.slice(slash + 1));
  try {
    const get = (header: string) => exchange.request.header(header);
    if (
      !exchange.behaviour.ignoreWriteConditions &&
      checkReadConditions(get, opened.record, 'x-amz-copy-source-') === 'unchanged'
    ) {
      throw preconditionFailed('x-amz-copy-source-If-None-Match');
    }
    return {
      ...opened,
      sameObject: (key: string) => bucket === exchange.bucket && opened.record.key === key,
    };
  } catch (error) {
    await opened.file.close();
    throw error;
  }
}

/** Copy bytes of an open object into a blob that `keep` gives an owner. */
export async function copyBytes<T>(
  exchange: BucketExchange,
  source: Awaited<ReturnType<typeof openSource>>,
  range: { start: number; length: number },
  names: readonly ChecksumName[],
  keep: (blob: string, copied: { md5: Buffer; checksums: Checksums }) => Promise<T>,
): Promise<T> {
  const blob = await exchange.store.newBlob();
  try {
    const write = writerOf(exchange, blob);
    const digests = new Digests(names);
    for (let done = 0; done < range.length; ) {
      const piece = Buffer.allocUnsafe(Math.min(PIECE, range.length - done));
      const { bytesRead } = await source.file.read(piece, 0, piece.length, range.start + done);
      if (bytesRead === 0) throw new Error('an object is shorter on disk than its record says');
      digests.update(piece.subarray(0, bytesRead));
      await write(piece.subarray(0, bytesRead));
      done += bytesRead;
    }
    await blob.finish();
    return await keep(blob.name, digests.finish());
  } catch (error) {
    await blob.discard();
    throw error;
  }
}

const checksumElements = (checksums: Checksums): Record<string, string | undefined> =>
  Object.fromEntries(CHECKSUM_NAMES.map((name) => [checksumElement(name), checksums[name]]));

export async function copyObject(exchange: KeyExchange): Promise<void> {
  const { request, store, bucket, key } = exchange;
  const description = describeFrom(exchange);
  assertMayWrite(exchange, bucket.index.get(key));
  const replaceMeta = request.header('x-amz-metadata-directive')?.toUpperCase() === 'REPLACE';
  const replaceTags = request.header('x-amz-tagging-directive')?.toUpperCase() === 'REPLACE';
  const source = await openSource(exchange);
  try {
    const from = source.record;
    const changes =
      replaceMeta ||
      ['x-amz-storage-class', 'x-amz-server-side-encryption', 'x-amz-website-redirect-location'].some(
        (name) => request.header(name) !== undefined,
      );
    if (source.sameObject(key) && !changes) {
      throw new S3Error(
        'InvalidRequest',
        "This copy request is illegal because it is trying to copy an object to itself without changing the object's metadata, storage class, website redirect location or encryption attributes.",
      );
    }
    const names = namesFor(request.header('x-amz-checksum-algorithm'), from);
    const whole = { start: 0, length: from.sizeBytes };
    const record = await copyBytes(exchange, source, whole, names, (blob, { md5, checksums }) =>
      store.commit(bucket, key, (current): ObjectRecord => {
        assertMayWrite(exchange, current);
        return {
          ...description,
          key,
          blob,
          sizeBytes: from.sizeBytes,
          etag: md5.toString('hex'),
          modifiedMs: exchange.nowMs(),
          system: replaceMeta ? description.system : { ...from.system, ...storageClass(description.system) },
          meta: replaceMeta ? description.meta : from.meta,
          tags: replaceTags ? description.tags : from.tags,
          checksums,
          checksumType: names.length === 0 ? undefined : 'FULL_OBJECT',
        };
      }),
    );
    await answerXml(exchange, 'CopyObjectResult', {
      LastModified: isoDate(record.modifiedMs),
      ETag: quoted(record.etag),
      ...checksumElements(record.checksums),
    });
  } finally {
    await source.file.close();
  }
}

function namesFor(asked: string | undefined, from: ObjectRecord): ChecksumName[] {
  const name = asked?.toLowerCase() ?? '';
  if (isChecksumName(name)) return [name];
  return CHECKSUM_NAMES.filter((one) => from.checksums[one] !== undefined);
}

const storageClass = (system: Record<string, string>): Record<string, string> =>
  system['x-amz-storage-class'] === undefined ? {} : { 'x-amz-storage-class': system['x-amz-storage-class'] };
