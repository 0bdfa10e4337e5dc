/** HTTP status of every error code the store answers with (Amazon S3 API reference, "Error responses"). */
const STATUS = {
  AccessControlListNotSupported: 400,
  AccessDenied: 403,
  AuthorizationHeaderMalformed: 400,
  AuthorizationQueryParametersError: 400,
  BadDigest: 400,
  BucketAlreadyOwnedByYou: 409,
  BucketNotEmpty: 409,
  EntityTooLarge: 400,
  EntityTooSmall: 400,
  IncompleteBody: 400,
  InternalError: 500,
  InvalidAccessKeyId: 403,
  InvalidArgument: 400,
  InvalidBucketName: 400,
  InvalidDigest: 400,
  InvalidLocationConstraint: 400,
  InvalidPart: 400,
  InvalidPartOrder: 400,
  InvalidRange: 416,
  InvalidRequest: 400,
  InvalidURI: 400,
  KeyTooLongError: 400,
  MalformedTrailerError: 400,
  MalformedXML: 400,
  MetadataTooLarge: 400,
  MethodNotAllowed: 405,
  MissingContentLength: 411,
  MissingRequestBodyError: 400,
  MissingSecurityHeader: 400,
  NoSuchBucket: 404,
  NoSuchBucketPolicy: 404,
  NoSuchCORSConfiguration: 404,
  NoSuchKey: 404,
  NoSuchLifecycleConfiguration: 404,
  NoSuchObjectLockConfiguration: 404,
  NoSuchPublicAccessBlockConfiguration: 404,
  NoSuchTagSet: 404,
  NoSuchUpload: 404,
  NoSuchVersion: 404,
  NoSuchWebsiteConfiguration: 404,
  NotImplemented: 501,
  ObjectLockConfigurationNotFoundError: 404,
  OwnershipControlsNotFoundError: 404,
  PreconditionFailed: 412,
  ReplicationConfigurationNotFoundError: 404,
  RequestTimeTooSkewed: 403,
  ServerSideEncryptionConfigurationNotFoundError: 404,
  SignatureDoesNotMatch: 403,
  SlowDown: 503,
  XAmzContentSHA256Mismatch: 400,
} as const;

export type S3Code = keyof typeof STATUS;

/** A refusal in the store's own words; `extra` are further elements of the error document. */
export class S3Error extends Error {
  override readonly name = 'S3Error';
  readonly status: number;
  constructor(
    readonly code: S3Code,
    message: string,
    readonly extra: Readonly<Record<string, string>> = {},
  ) {
    super(message);
    this.status = STATUS[code];
  }
}

export const noSuchKey = (key: string) =>
  new S3Error('NoSuchKey', 'The specified key does not exist.', { Key: key });

export const notImplemented = () =>
  new S3Error(
    'NotImplemented',
    'A header or query you provided implies functionality that is not implemented.',
  );

export const preconditionFailed = (condition: string) =>
  new S3Error('PreconditionFailed', 'At least one of the pre-conditions you specified did not hold', {
    Condition: condition,
  });
