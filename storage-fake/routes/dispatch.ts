import { noSuchKey, notImplemented, S3Error } from '../errors';
import type { BucketExchange, Exchange, KeyExchange } from '../exchange';
import { createBucket, deleteBucket, getBucketLocation, headBucket, listBuckets } from './buckets';
import { completeMultipartUpload } from './completeUpload';
import { copyObject } from './copyObject';
import { deleteObject, deleteObjects } from './deleteObject';
import { getObject } from './getObject';
import { listObjectsV1, listObjectsV2, listObjectVersions } from './listObjects';
import {
  abortMultipartUpload,
  createMultipartUpload,
  listMultipartUploads,
  listParts,
  uploadPart,
  uploadPartCopy,
} from './multipartUpload';
import {
  getLegalHold,
  getLockConfiguration,
  getRetention,
  putLegalHold,
  putLockConfiguration,
  putRetention,
} from './objectLock';
import { putObject } from './putObject';
import {
  deleteTags,
  getAcl,
  getAttributes,
  getBucketConfiguration,
  getTags,
  putAcl,
  putTags,
} from './subresources';

type Handler<E> = (exchange: E) => Promise<void>;

/** Query parameters that name an operation of S3; one that has no handler here is answered 501, not taken for another. */
const OPERATIONS = [
  'accelerate',
  'acl',
  'analytics',
  'attributes',
  'cors',
  'delete',
  'encryption',
  'intelligent-tiering',
  'inventory',
  'legal-hold',
  'lifecycle',
  'location',
  'logging',
  'metrics',
  'notification',
  'object-lock',
  'ownershipControls',
  'policy',
  'policyStatus',
  'publicAccessBlock',
  'replication',
  'requestPayment',
  'restore',
  'retention',
  'select',
  'tagging',
  'torrent',
  'uploadId',
  'uploads',
  'versioning',
  'versions',
  'website',
];

const KEY_HANDLERS: Record<string, Handler<KeyExchange>> = {
  GET: getObject,
  HEAD: getObject,
  'GET acl': getAcl,
  'GET attributes': getAttributes,
  'GET legal-hold': getLegalHold,
  'GET retention': getRetention,
  'GET tagging': getTags,
  'GET uploadId': listParts,
  PUT: (exchange) =>
    (exchange.request.header('x-amz-copy-source') === undefined ? putObject : copyObject)(exchange),
  'PUT acl': putAcl,
  'PUT legal-hold': putLegalHold,
  'PUT retention': putRetention,
  'PUT tagging': putTags,
  'PUT uploadId': (exchange) =>
    (exchange.request.header('x-amz-copy-source') === undefined ? uploadPart : uploadPartCopy)(exchange),
  'POST uploads': createMultipartUpload,
  'POST uploadId': completeMultipartUpload,
  DELETE: deleteObject,
  'DELETE tagging': deleteTags,
  'DELETE uploadId': abortMultipartUpload,
};

const BUCKET_HANDLERS: Record<string, Handler<BucketExchange>> = {
  GET: (exchange) =>
    (exchange.request.query.get('list-type') === '2' ? listObjectsV2 : listObjectsV1)(exchange),
  HEAD: headBucket,
  'GET acl': getAcl,
  'GET location': getBucketLocation,
  'GET object-lock': getLockConfiguration,
  'GET uploads': listMultipartUploads,
  'GET versions': listObjectVersions,
  'PUT acl': putAcl,
  'PUT object-lock': putLockConfiguration,
  'POST delete': deleteObjects,
  DELETE: deleteBucket,
};

/** Give an authenticated request to the one operation it asks for. */
export async function dispatch(exchange: Exchange): Promise<void> {
  const { request, store } = exchange;
  const operation = OPERATIONS.find((name) => request.has(name));
  const route = operation === undefined ? request.method : `${request.method} ${operation}`;
  if (request.bucket === undefined) {
    if (route === 'GET') return listBuckets(exchange);
    throw new S3Error('MethodNotAllowed', 'The specified method is not allowed against this resource.');
  }
  if (request.key === undefined && route === 'PUT') return createBucket(exchange, request.bucket);
  const bucket = store.bucket(request.bucket);
  if (request.key === undefined) {
    if (request.method === 'GET' && (await getBucketConfiguration({ ...exchange, bucket }))) return;
    return handlerOf(BUCKET_HANDLERS, route)({ ...exchange, bucket });
  }
  const version = request.query.get('versionId');
  if (version !== undefined && version !== '' && version !== 'null') {
    if (bucket.index.get(request.key) === undefined) throw noSuchKey(request.key);
    throw new S3Error('NoSuchVersion', 'The specified version does not exist.');
  }
  return handlerOf(KEY_HANDLERS, route)({ ...exchange, bucket, key: request.key });
}

function handlerOf<E>(handlers: Record<string, Handler<E>>, route: string): Handler<E> {
  const handler = Object.hasOwn(handlers, route) ? handlers[route] : undefined;
  if (handler !== undefined) return handler;
  if (route.includes(' ')) throw notImplemented();
  throw new S3Error('MethodNotAllowed', 'The specified method is not allowed against this resource.');
}
