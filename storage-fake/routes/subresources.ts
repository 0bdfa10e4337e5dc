import { answerEmpty, answerXml } from '../answer';
import { CHECKSUM_NAMES, checksumElement } from '../checksums';
import { httpDate } from '../describe';
import { noSuchKey, type S3Code, S3Error } from '../errors';
import type { BucketExchange, KeyExchange } from '../exchange';
import type { ObjectRecord } from '../objects';
import { childrenOf, parseXml, textOfChild, type XmlValue } from '../xml';
import { receiveDocument, receiveOptionalDocument } from './receiveBlob';

// The small things that clients ask about a bucket or an object on their way to something else.

const OWNER = { ID: 'storage-fake', DisplayName: 'storage-fake' };

function existing({ bucket, key }: KeyExchange): ObjectRecord {
  const record = bucket.index.get(key);
  if (record === undefined) throw noSuchKey(key);
  return record;
}

/** Bucket configurations that this store never has, and how S3 says so. */
const ABSENT: Record<string, S3Code> = {
  policy: 'NoSuchBucketPolicy',
  lifecycle: 'NoSuchLifecycleConfiguration',
  cors: 'NoSuchCORSConfiguration',
  tagging: 'NoSuchTagSet',
  website: 'NoSuchWebsiteConfiguration',
  encryption: 'ServerSideEncryptionConfigurationNotFoundError',
  replication: 'ReplicationConfigurationNotFoundError',
  ownershipControls: 'OwnershipControlsNotFoundError',
  publicAccessBlock: 'NoSuchPublicAccessBlockConfiguration',
};

/** Configurations that are there and empty. */
const EMPTY: Record<string, readonly [root: string, value: XmlValue]> = {
  versioning: ['VersioningConfiguration', {}],
  logging: ['BucketLoggingStatus', {}],
  notification: ['NotificationConfiguration', {}],
  accelerate: ['AccelerateConfiguration', {}],
  requestPayment: ['RequestPaymentConfiguration', { Payer: 'BucketOwner' }],
};

/** @returns false where the request asks for no such configuration */
export async function getBucketConfiguration(exchange: BucketExchange): Promise<boolean> {
  for (const [name, code] of Object.entries(ABSENT)) {
    if (exchange.request.has(name)) throw new S3Error(code, `The bucket has no ${name} configuration`);
  }
  for (const [name, [root, value]] of Object.entries(EMPTY)) {
    if (!exchange.request.has(name)) continue;
    await answerXml(exchange, root, value);
    return true;
  }
  return false;
}

/** The owner may do everything and nobody else anything. */
export async function getAcl(exchange: BucketExchange): Promise<void> {
  await answerXml(exchange, 'AccessControlPolicy', {
    Owner: OWNER,
    AccessControlList: { Grant: { Grantee: OWNER, Permission: 'FULL_CONTROL' } },
  });
}

export async function putAcl(exchange: BucketExchange): Promise<void> {
  await receiveOptionalDocument(exchange);
  if ((exchange.request.header('x-amz-acl') ?? 'other') !== 'private') {
    throw new S3Error('AccessControlListNotSupported', 'The bucket does not allow ACLs');
  }
  await answerEmpty(exchange, 200);
}

export async function getTags(exchange: KeyExchange): Promise<void> {
  const tags = Object.entries(existing(exchange).tags).map(([Key, Value]) => ({ Key, Value }));
  await answerXml(exchange, 'Tagging', { TagSet: { Tag: tags } });
}

export async function putTags(exchange: KeyExchange): Promise<void> {
  const root = parseXml((await receiveDocument(exchange)).text);
  const [set] = childrenOf(root, 'TagSet');
  if (set === undefined) throw new S3Error('MalformedXML', 'A TagSet is needed');
  const tags = Object.fromEntries(
    childrenOf(set, 'Tag').map((tag) => [textOfChild(tag, 'Key') ?? '', textOfChild(tag, 'Value') ?? '']),
  );
  await setTags(exchange, tags);
  await answerEmpty(exchange, 200);
}

export async function deleteTags(exchange: KeyExchange): Promise<void> {
  await setTags(exchange, {});
  await answerEmpty(exchange, 204);
}

async function setTags({ store, bucket, key }: KeyExchange, tags: Record<string, string>): Promise<void> {
  await store.commit(bucket, key, (current) => {
    if (current === undefined) throw noSuchKey(key);
    return { ...current, tags };
  });
}

/** GetObjectAttributes */
export async function getAttributes(exchange: KeyExchange): Promise<void> {
  const record = existing(exchange);
  const asked = new Set(
    (exchange.request.header('x-amz-object-attributes') ?? '').split(',').map((one) => one.trim()),
  );
  const checksums = CHECKSUM_NAMES.flatMap((name) =>
    record.checksums[name] === undefined ? [] : [[checksumElement(name), record.checksums[name]] as const],
  );
  const checksum =
    checksums.length === 0
      ? undefined
      : { ...Object.fromEntries(checksums), ChecksumType: record.checksumType };
  await answerXml(
    exchange,
    'GetObjectAttributesResponse',
    {
      ETag: asked.has('ETag') ? record.etag : undefined,
      Checksum: asked.has('Checksum') ? checksum : undefined,
      ObjectParts:
        asked.has('ObjectParts') && record.partSizes ? { PartsCount: record.partSizes.length } : undefined,
      StorageClass: asked.has('StorageClass')
        ? (record.system['x-amz-storage-class'] ?? 'STANDARD')
        : undefined,
      ObjectSize: asked.has('ObjectSize') ? record.sizeBytes : undefined,
    },
    { 'last-modified': httpDate(record.modifiedMs) },
  );
}
