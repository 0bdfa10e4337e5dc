import { randomBytes } from 'node:crypto';
import { answerEmpty, answerXml } from '../answer';
import { CHECKSUM_NAMES, type ChecksumName, checksumElement, isChecksumName } from '../checksums';
import { checksumHeaders, describeFrom, isoDate, quoted } from '../describe';
import { S3Error } from '../errors';
import type { BucketExchange, KeyExchange } from '../exchange';
import { createUpload, removeUpload, savePart, type Upload, type UploadPart } from '../multipart';
import { parseRange } from '../range';
import { copyBytes, openSource } from './copyObject';
import { encoderOf } from './listObjects';
import { receiveBlob } from './receiveBlob';

const PARTS_MAX = 10_000;
const OWNER = { ID: 'storage-fake', DisplayName: 'storage-fake' };

/** @throws S3Error NoSuchUpload */
export function uploadOf(exchange: KeyExchange): Upload {
  const upload = exchange.bucket.uploads.get(exchange.request.query.get('uploadId') ?? '');
  if (upload === undefined || upload.record.key !== exchange.key) {
    throw new S3Error(
      'NoSuchUpload',
      'The specified upload does not exist. The upload ID may be invalid, or the upload may have been aborted or completed.',
    );
  }
  return upload;
}

export async function createMultipartUpload(exchange: KeyExchange): Promise<void> {
  const { request, bucket, key } = exchange;
  const name = request.header('x-amz-checksum-algorithm')?.toLowerCase();
  if (name !== undefined && !isChecksumName(name)) {
    throw new S3Error('InvalidRequest', 'Checksum algorithm provided is unsupported.');
  }
  const record = {
    id: randomBytes(16).toString('hex'),
    key,
    initiatedMs: exchange.nowMs(),
    ...describeFrom(exchange),
    checksumAlgorithm: name,
    checksumType: name && checksumTypeOf(name, request.header('x-amz-checksum-type')),
  };
  bucket.uploads.set(record.id, await createUpload(`${bucket.directory}/uploads`, record));
  await answerXml(
    exchange,
    'InitiateMultipartUploadResult',
    { Bucket: bucket.record.name, Key: key, UploadId: record.id },
    { 'x-amz-checksum-algorithm': name?.toUpperCase(), 'x-amz-checksum-type': record.checksumType },
  );
}

/** A CRC can be taken over the whole object, a hash only over the parts' hashes. */
function checksumTypeOf(name: ChecksumName, asked: string | undefined): 'FULL_OBJECT' | 'COMPOSITE' {
  const type = asked?.toUpperCase() ?? (name === 'crc64nvme' ? 'FULL_OBJECT' : 'COMPOSITE');
  const possible =
    name === 'crc64nvme'
      ? ['FULL_OBJECT']
      : name.startsWith('sha')
        ? ['COMPOSITE']
        : ['FULL_OBJECT', 'COMPOSITE'];
  if (!possible.includes(type)) {
    throw new S3Error(
      'InvalidRequest',
      `The ${type} checksum type cannot be used with the ${name} checksum algorithm.`,
    );
  }
  return type as 'FULL_OBJECT' | 'COMPOSITE';
}

function partNumberOf(exchange: KeyExchange): number {
  const number = Number(exchange.request.query.get('partNumber'));
  if (Number.isInteger(number) && number >= 1 && number <= PARTS_MAX) return number;
  throw new S3Error(
    'InvalidArgument',
    `Part number must be an integer between 1 and ${PARTS_MAX}, inclusive`,
  );
}

const algorithmsOf = (upload: Upload): ChecksumName[] =>
  upload.record.checksumAlgorithm === undefined ? [] : [upload.record.checksumAlgorithm];

async function keepPart(exchange: KeyExchange, upload: Upload, part: UploadPart): Promise<UploadPart> {
  // The upload may have been completed or aborted while the bytes came.
  uploadOf(exchange);
  const before = await savePart(upload, part);
  if (before !== undefined) await exchange.store.removeBlob(before.blob);
  return part;
}

export async function uploadPart(exchange: KeyExchange): Promise<void> {
  const upload = uploadOf(exchange);
  const number = partNumberOf(exchange);
  const part = await receiveBlob(
    exchange,
    (blob, received) =>
      keepPart(exchange, upload, {
        number,
        blob,
        sizeBytes: received.size,
        etag: received.md5.toString('hex'),
        modifiedMs: exchange.nowMs(),
        checksums: received.checksums,
      }),
    algorithmsOf(upload),
  );
  await answerEmpty(exchange, 200, {
    etag: quoted(part.etag),
    ...checksumHeaders({ checksums: part.checksums }),
  });
}

export async function uploadPartCopy(exchange: KeyExchange): Promise<void> {
  const upload = uploadOf(exchange);
  const number = partNumberOf(exchange);
  const source = await openSource(exchange);
  try {
    const size = source.record.sizeBytes;
    const range = parseRange(exchange.request.header('x-amz-copy-source-range'), size) ?? {
      start: 0,
      length: size,
    };
    const part = await copyBytes(exchange, source, range, algorithmsOf(upload), (blob, { md5, checksums }) =>
      keepPart(exchange, upload, {
        number,
        blob,
        sizeBytes: range.length,
        etag: md5.toString('hex'),
        modifiedMs: exchange.nowMs(),
        checksums,
      }),
    );
    await answerXml(exchange, 'CopyPartResult', {
      LastModified: isoDate(part.modifiedMs),
      ETag: quoted(part.etag),
    });
  } finally {
    await source.file.close();
  }
}

export async function abortMultipartUpload(exchange: KeyExchange): Promise<void> {
  await dropUpload(exchange, uploadOf(exchange));
  await answerEmpty(exchange, 204);
}

/** Forget an upload: first its records, then the bytes of its parts. */
export async function dropUpload({ bucket, store }: BucketExchange, upload: Upload): Promise<void> {
  bucket.uploads.delete(upload.record.id);
  await removeUpload(upload);
  for (const part of upload.parts.values()) await store.removeBlob(part.blob);
}

export async function listParts(exchange: KeyExchange): Promise<void> {
  const { query } = exchange.request;
  const upload = uploadOf(exchange);
  const after = Number(query.get('part-number-marker') ?? 0);
  const limit = Math.min(Number(query.get('max-parts') ?? 1000), 1000);
  const rest = [...upload.parts.values()]
    .filter(({ number }) => number > after)
    .sort((a, b) => a.number - b.number);
  const page = rest.slice(0, limit);
  await answerXml(exchange, 'ListPartsResult', {
    Bucket: exchange.bucket.record.name,
    Key: encoderOf(exchange).encode(exchange.key),
    UploadId: upload.record.id,
    PartNumberMarker: after,
    NextPartNumberMarker: page.at(-1)?.number,
    MaxParts: limit,
    IsTruncated: rest.length > page.length,
    ChecksumAlgorithm: upload.record.checksumAlgorithm?.toUpperCase(),
    ChecksumType: upload.record.checksumType,
    Initiator: OWNER,
    Owner: OWNER,
    StorageClass: 'STANDARD',
    Part: page.map((part) => ({
      PartNumber: part.number,
      LastModified: isoDate(part.modifiedMs),
      ETag: quoted(part.etag),
      Size: part.sizeBytes,
      ...Object.fromEntries(CHECKSUM_NAMES.map((name) => [checksumElement(name), part.checksums[name]])),
    })),
  });
}

export async function listMultipartUploads(exchange: BucketExchange): Promise<void> {
  const { query } = exchange.request;
  const { type, encode } = encoderOf(exchange);
  const prefix = query.get('prefix') ?? '';
  const [keyMarker, idMarker] = [query.get('key-marker') ?? '', query.get('upload-id-marker') ?? ''];
  const limit = Math.min(Number(query.get('max-uploads') ?? 1000), 1000);
  const rest = [...exchange.bucket.uploads.values()]
    .map(({ record }) => record)
    .filter(({ key }) => key.startsWith(prefix))
    .sort((a, b) =>
      a.key === b.key ? a.initiatedMs - b.initiatedMs || (a.id < b.id ? -1 : 1) : a.key < b.key ? -1 : 1,
    );
  const from =
    keyMarker === ''
      ? 0
      : rest.findIndex(({ key, id }) => key > keyMarker || (key === keyMarker && id === idMarker));
  const start = from < 0 ? rest.length : from + (rest[from]?.key === keyMarker && keyMarker !== '' ? 1 : 0);
  const page = rest.slice(start, start + limit);
  const truncated = rest.length > start + page.length;
  await answerXml(exchange, 'ListMultipartUploadsResult', {
    Bucket: exchange.bucket.record.name,
    KeyMarker: encode(keyMarker),
    UploadIdMarker: idMarker,
    NextKeyMarker: truncated ? encode(page.at(-1)?.key ?? '') : undefined,
    NextUploadIdMarker: truncated ? page.at(-1)?.id : undefined,
    Prefix: encode(prefix),
    EncodingType: type,
    MaxUploads: limit,
    IsTruncated: truncated,
    Upload: page.map(({ key, id, initiatedMs }) => ({
      Key: encode(key),
      UploadId: id,
      Initiator: OWNER,
      Owner: OWNER,
      StorageClass: 'STANDARD',
      Initiated: isoDate(initiatedMs),
    })),
  });
}
