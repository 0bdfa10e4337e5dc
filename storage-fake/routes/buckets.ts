import { answerEmpty, answerXml } from '../answer';
import { isoDate } from '../describe';
import { S3Error } from '../errors';
import type { BucketExchange, Exchange } from '../exchange';
import { parseXml, textOfChild } from '../xml';
import { receiveOptionalDocument } from './receiveBlob';

export async function listBuckets(exchange: Exchange): Promise<void> {
  const buckets = exchange.store.listBuckets();
  await answerXml(exchange, 'ListAllMyBucketsResult', {
    Owner: { ID: 'storage-fake', DisplayName: 'storage-fake' },
    Buckets: {
      Bucket: buckets.map(({ name, createdMs }) => ({ Name: name, CreationDate: isoDate(createdMs) })),
    },
  });
}

export async function createBucket(exchange: Exchange, name: string): Promise<void> {
  const { request, behaviour } = exchange;
  const text = await receiveOptionalDocument(exchange);
  const location = text === '' ? undefined : textOfChild(parseXml(text), 'LocationConstraint');
  if (location !== undefined && location !== '' && location !== behaviour.region) {
    throw new S3Error('InvalidLocationConstraint', 'The specified location-constraint is not valid', {
      LocationConstraint: location,
    });
  }
  const objectLock = request.header('x-amz-bucket-object-lock-enabled')?.toLowerCase() === 'true';
  if (objectLock && behaviour.objectLock === 'unknown') {
    throw new S3Error('NotImplemented', 'This store does not know object lock.');
  }
  await exchange.store.createBucket({ name, createdMs: exchange.nowMs(), objectLock });
  await answerEmpty(exchange, 200, { location: `/${name}` });
}

export async function deleteBucket(exchange: BucketExchange): Promise<void> {
  await exchange.store.deleteBucket(exchange.bucket.record.name);
  await answerEmpty(exchange, 204);
}

export async function headBucket(exchange: BucketExchange): Promise<void> {
  await answerEmpty(exchange, 200, { 'x-amz-bucket-region': exchange.behaviour.region });
}

/** us-east-1 is answered as nothing, for history's sake (GetBucketLocation, Amazon S3 API reference). */
export async function getBucketLocation(exchange: BucketExchange): Promise<void> {
  const { region } = exchange.behaviour;
  await answerXml(exchange, 'LocationConstraint', region === 'us-east-1' ? '' : region);
}
