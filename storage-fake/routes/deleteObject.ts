import { answerEmpty, answerXml } from '../answer';
import { CHECKSUM_NAMES, checksumHeader } from '../checksums';
import { checkWriteConditions } from '../conditions';
import { S3Error } from '../errors';
import type { BucketExchange, KeyExchange } from '../exchange';
import { assertUnlocked } from '../locks';
import { childrenOf, parseXml, textOfChild, type XmlValue } from '../xml';
import { bypassesGovernance } from './putObject';
import { receiveDocument } from './receiveBlob';

const KEYS_MAX = 1000;

export async function deleteObject(exchange: KeyExchange): Promise<void> {
  const { store, bucket, key } = exchange;
  await store.remove(bucket, key, (current) => {
    checkWriteConditions((name) => exchange.request.header(name), key, current);
    assertUnlocked(current, exchange.nowMs(), bypassesGovernance(exchange));
  });
  await answerEmpty(exchange, 204);
}

/** DeleteObjects: up to a thousand keys in one request. */
export async function deleteObjects(exchange: BucketExchange): Promise<void> {
  const { request } = exchange;
  const declares = ['content-md5', 'x-amz-trailer', ...CHECKSUM_NAMES.map(checksumHeader)];
  if (!declares.some((name) => request.header(name) !== undefined)) {
    throw new S3Error('InvalidRequest', 'Missing required header for this request: Content-MD5');
  }
  const root = parseXml((await receiveDocument(exchange)).text);
  const objects = childrenOf(root, 'Object');
  if (root.name !== 'Delete' || objects.length === 0 || objects.length > KEYS_MAX) {
    throw new S3Error(
      'MalformedXML',
      'The XML you provided was not well-formed or did not validate against our published schema',
    );
  }
  const deleted: XmlValue[] = [];
  const errors: XmlValue[] = [];
  for (const object of objects) {
    const key = textOfChild(object, 'Key') ?? '';
    const versionId = textOfChild(object, 'VersionId');
    try {
      await removeOne({ ...exchange, key }, versionId);
      deleted.push({ Key: key, VersionId: versionId });
    } catch (error) {
      if (!(error instanceof S3Error)) throw error;
      errors.push({ Key: key, VersionId: versionId, Code: error.code, Message: error.message });
    }
  }
  const quiet = textOfChild(root, 'Quiet') === 'true';
  await answerXml(exchange, 'DeleteResult', { Deleted: quiet ? [] : deleted, Error: errors });
}

async function removeOne(exchange: KeyExchange, versionId: string | undefined): Promise<void> {
  if (versionId !== undefined && versionId !== '' && versionId !== 'null') {
    throw new S3Error('NoSuchVersion', 'The specified version does not exist.');
  }
  await exchange.store.remove(exchange.bucket, exchange.key, (current) =>
    assertUnlocked(current, exchange.nowMs(), bypassesGovernance(exchange)),
  );
}
