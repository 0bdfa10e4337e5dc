import { answerEmpty, answerXml } from '../answer';
import { CHECKSUM_NAMES, checksumElement } from '../checksums';
import { httpDate } from '../describe';
import { noSuchKey, type S3Code, S3Error } from '../errors';
import type { BucketExchange, KeyExchange } from '../exchange';
import type { ObjectRecord } from '../objects';
import { childrenOf, parseXml, textOfChild, type XmlElement, type XmlValue } from '../xml';
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

function assertThere({ bucket, key }: BucketExchange & { key?: string }): void {
  if (key !== undefined && bucket.index.get(key) === undefined) throw noSuchKey(key);
}

const USER_TYPE = 'xmlns:xsi="http://www.w3.org/2001/XMLSchema-instance" xsi:type="CanonicalUser"';

/** The owner may do everything and nobody else anything. */
export async function getAcl(exchange: BucketExchange & { key?: string }): Promise<void> {
  assertThere(exchange);
  await answerXml(exchange, 'AccessControlPolicy', {
    Owner: OWNER,
    AccessControlList: { Grant: { Grantee: { '@': USER_TYPE, ...OWNER }, Permission: 'FULL_CONTROL' } },
  });
}

/** Takes a list that changes nothing, as some clients send after a copy; any other is refused. */
export async function putAcl(exchange: BucketExchange & { key?: string }): Promise<void> {
  assertThere(exchange);
  const text = await receiveOptionalDocument(exchange);
  const canned = exchange.request.header('x-amz-acl');
  const onlyOwner =
    canned === undefined ? text !== '' && grantsOnlyOwner(parseXml(text)) : canned === 'private';
  if (!onlyOwner) throw new S3Error('AccessControlListNotSupported', 'The bucket does not allow ACLs');
  await answerEmpty(exchange, 200);
}

function grantsOnlyOwner(policy: XmlElement): boolean {
  const grants = childrenOf(policy, 'AccessControlList').flatMap((list) => childrenOf(list, 'Grant'));
  return grants.every((grant) =>
    childrenOf(grant, 'Grantee').every((who) => textOfChild(who, 'ID') === OWNER.ID),
  );
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
