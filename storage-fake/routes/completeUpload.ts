import { createHash } from 'node:crypto';
import { createReadStream } from 'node:fs';
import { answerXml } from '../answer';
import {
  CHECKSUM_NAMES,
  type Checksums,
  checkChecksum,
  checksumElement,
  checksumHeader,
  Digests,
} from '../checksums';
import { quoted } from '../describe';
import { S3Error } from '../errors';
import type { KeyExchange } from '../exchange';
import type { Upload, UploadPart } from '../multipart';
import { childrenOf, parseXml, textOfChild, type XmlElement } from '../xml';
import { dropUpload, uploadOf } from './multipartUpload';
import { assertMayWrite } from './putObject';
import { receiveDocument, writerOf } from './receiveBlob';

const PART_BYTES_MIN = 5 * 1024 * 1024;

/** CompleteMultipartUpload: the parts become one object at one moment, or not at all. */
export async function completeMultipartUpload(exchange: KeyExchange): Promise<void> {
  const { bucket, key, store, request } = exchange;
  const upload = uploadOf(exchange);
  assertMayWrite(exchange, bucket.index.get(key));
  const parts = chosenParts(
    upload,
    parseXml((await receiveDocument(exchangeWithoutChecksum(exchange))).text),
  );
  const sizeBytes = parts.reduce((sum, part) => sum + part.sizeBytes, 0);
  const declaredSize = request.header('x-amz-mp-object-size');
  if (declaredSize !== undefined && Number(declaredSize) !== sizeBytes) {
    throw new S3Error(
      'InvalidRequest',
      `The provided 'x-amz-mp-object-size' header does not match what was computed.`,
    );
  }
  const { system, meta, tags, retention, legalHold, checksumType } = upload.record;
  const record = await joinParts(exchange, upload, parts, (blob, checksums) =>
    store.commit(bucket, key, (current) => {
      uploadOf(exchange);
      assertMayWrite(exchange, current);
      return {
        key,
        blob,
        sizeBytes,
        etag: compositeEtag(parts),
        modifiedMs: exchange.nowMs(),
        system,
        meta,
        tags,
        retention,
        legalHold,
        checksums,
        checksumType,
        partSizes: parts.map((part) => part.sizeBytes),
      };
    }),
  );
  // The object is durable. Killed here, the upload is listed again after a restart and can be aborted.
  await dropUpload(exchange, upload);
  await answerXml(exchange, 'CompleteMultipartUploadResult', {
    Location: `http://${request.header('host')}/${bucket.record.name}/${encodeURIComponent(key)}`,
    Bucket: bucket.record.name,
    Key: key,
    ETag: quoted(record.etag),
    ...Object.fromEntries(CHECKSUM_NAMES.map((name) => [checksumElement(name), record.checksums[name]])),
    ChecksumType: record.checksumType,
  });
}

/** Here an `x-amz-checksum-…` header is about the object, not about the XML that carries the list. */
function exchangeWithoutChecksum(exchange: KeyExchange): KeyExchange {
  const request = Object.create(exchange.request, {
    header: {
      value: (name: string) =>
        name.startsWith('x-amz-checksum-') || name.startsWith('x-amz-sdk-checksum-')
          ? undefined
          : exchange.request.header(name),
    },
  }) as KeyExchange['request'];
  return { ...exchange, request };
}

function chosenParts(upload: Upload, root: XmlElement): UploadPart[] {
  const listed = childrenOf(root, 'Part');
  if (root.name !== 'CompleteMultipartUpload' || listed.length === 0) {
    throw new S3Error(
      'MalformedXML',
      'The XML you provided was not well-formed or did not validate against our published schema',
    );
  }
  const numbers = listed.map((element) => Number(textOfChild(element, 'PartNumber')));
  if (!numbers.every((number, i) => number > (numbers[i - 1] ?? 0))) {
    throw new S3Error('InvalidPartOrder', 'The list of parts was not in ascending order.');
  }
  const parts = listed.map((element, i) => namedPart(upload, element, numbers[i] as number));
  const small = parts.slice(0, -1).find((part) => part.sizeBytes < PART_BYTES_MIN);
  if (small !== undefined) {
    throw new S3Error('EntityTooSmall', 'Your proposed upload is smaller than the minimum allowed size', {
      ProposedSize: String(small.sizeBytes),
      MinSizeAllowed: String(PART_BYTES_MIN),
    });
  }
  return parts;
}

/** The part that the list names, if it is still the one that the client saw stored. */
function namedPart(upload: Upload, element: XmlElement, number: number): UploadPart {
  const part = upload.parts.get(number);
  const etag = (textOfChild(element, 'ETag') ?? '').replaceAll('"', '');
  const same =
    part?.etag === etag &&
    CHECKSUM_NAMES.every((name) => {
      const value = textOfChild(element, checksumElement(name));
      return value === undefined || part.checksums[name] === undefined || part.checksums[name] === value;
    });
  if (part === undefined || !same) {
    throw new S3Error('InvalidPart', 'One or more of the specified parts could not be found.', {
      PartNumber: String(number),
    });
  }
  return part;
}

/** MD5 over the MD5s of the parts, and their number: common practice of S3, not a documented promise. */
function compositeEtag(parts: readonly UploadPart[]): string {
  const hash = createHash('md5');
  for (const part of parts) hash.update(Buffer.from(part.etag, 'hex'));
  return `${hash.digest('hex')}-${parts.length}`;
}

async function joinParts<T>(
  exchange: KeyExchange,
  upload: Upload,
  parts: readonly UploadPart[],
  keep: (blob: string, checksums: Checksums) => Promise<T>,
): Promise<T> {
  const { store } = exchange;
  const { checksumAlgorithm: name, checksumType } = upload.record;
  const blob = await store.newBlob();
  try {
    const write = writerOf(exchange, blob);
    const digests = new Digests(name !== undefined && checksumType === 'FULL_OBJECT' ? [name] : []);
    for (const part of parts) {
      for await (const piece of createReadStream(store.blobPath(part.blob), { highWaterMark: 1024 * 1024 })) {
        digests.update(piece as Buffer);
        await write(piece as Buffer);
      }
    }
    await blob.finish();
    const checksums =
      checksumType === 'COMPOSITE' ? compositeChecksum(upload, parts) : digests.finish().checksums;
    const declared = name && exchange.request.header(checksumHeader(name));
    if (name && declared !== undefined)
      checkChecksum(name, declared.replace(/-\d+$/, ''), checksums[name]?.replace(/-\d+$/, ''));
    return await keep(blob.name, checksums);
  } catch (error) {
    await blob.discard();
    throw error;
  }
}

/** The checksum over the parts' checksums, and their number. */
function compositeChecksum(upload: Upload, parts: readonly UploadPart[]): Checksums {
  const name = upload.record.checksumAlgorithm;
  if (name === undefined) return {};
  const digests = new Digests([name]);
  for (const part of parts) digests.update(Buffer.from(part.checksums[name] ?? '', 'base64'));
  return { [name]: `${digests.finish().checksums[name]}-${parts.length}` };
}
