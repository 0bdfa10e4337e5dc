/**
 * The catalogue of problems (RFC 9457). Codes are stable: `type` is `<origin>/problems/<code>` and a working page.
 * `keeps` says what became of what was sent; `next` is the next step for the device maker or the person.
 */
export interface ProblemKind {
  status: number;
  title: string;
  keeps: string;
  next: string;
}

export const PROBLEMS = {
  'body-invalid': {
    status: 400,
    title: 'The request body is not right',
    keeps: 'Nothing was stored.',
    next: 'Correct the fields listed under errors and send it again.',
  },
  'body-too-large': {
    status: 413,
    title: 'The request body is too large',
    keeps: 'Nothing was stored.',
    next: 'Recordings go to the presigned address, not here.',
  },
  'media-type-unsupported': {
    status: 415,
    title: 'The media type is not taken here',
    keeps: 'Nothing was stored.',
    next: 'Send application/json, or a media type that the device model allows.',
  },
  'token-invalid': {
    status: 401,
    title: 'The credential is not accepted',
    keeps: 'Nothing was stored. Clips on the device stay valid.',
    next: 'Renew the credential, or enrol the device again at the bench.',
  },
  'renewal-needed': {
    status: 401,
    title: 'The credential must be renewed first',
    keeps: 'Nothing was stored. Clips on the device stay valid.',
    next: 'Renew the credential with the key of the device, then repeat the call with the new one.',
  },
  'proof-invalid': {
    status: 401,
    title: 'The proof of possession is not accepted',
    keeps: 'Nothing was stored.',
    next: 'Sign a DPoP proof with the enrolled key for this method and address (RFC 9449).',
  },
  'use-dpop-nonce': {
    status: 401,
    title: 'The proof needs the nonce of this server',
    keeps: 'Nothing was stored.',
    next: 'Repeat the call with the nonce of the DPoP-Nonce field in the proof.',
  },
  'client-refused': {
    status: 401,
    title: 'The API client is not accepted',
    keeps: 'Nothing was given.',
    next: 'Check client id and secret, or the assertion and its times (RFC 7523). The Key room shows whether it was revoked.',
  },
  'grant-refused': {
    status: 400,
    title: 'This grant is not given here',
    keeps: 'Nothing was given.',
    next: 'Ask with grant_type=client_credentials (RFC 6749, 4.4).',
  },
  'scope-refused': {
    status: 400,
    title: 'The client does not have that scope',
    keeps: 'Nothing was given.',
    next: 'Ask for scopes that the client has, or leave scope out and get all of them.',
  },
  'access-token-refused': {
    status: 401,
    title: 'The access token is not accepted',
    keeps: 'Nothing was given.',
    next: 'Ask for a new token. They live ten minutes.',
  },
  'scope-missing': {
    status: 403,
    title: 'The access token does not allow this',
    keeps: 'Nothing was given.',
    next: 'Ask IT for a client with the scope that the detail names.',
  },
  'sign-in-required': {
    status: 401,
    title: 'Sign in first',
    keeps: 'Nothing was changed.',
    next: 'Sign in and try again.',
  },
  'sign-in-refused': {
    status: 401,
    title: 'Not signed in',
    keeps: 'Nothing was changed.',
    next: 'Check e-mail and password. If you forgot the password, have a new one set.',
  },
  'second-factor-required': {
    status: 403,
    title: 'A second factor is required',
    keeps: 'Nothing was changed.',
    next: 'Set up or enter the second factor.',
  },
  'not-found': {
    status: 404,
    title: 'There is nothing here that you may see',
    keeps: 'Nothing was changed.',
    next: 'Check the address or the number.',
  },
  'reason-required': {
    status: 403,
    title: 'This patient is outside your wards',
    keeps: 'Nothing was changed.',
    next: 'Give the reason for looking. It is shown to the auditor.',
  },
  'method-not-allowed': {
    status: 405,
    title: 'This address does not take that method',
    keeps: 'Nothing was changed.',
    next: 'See the Allow field.',
  },
  'origin-refused': {
    status: 403,
    title: 'The request came from another site',
    keeps: 'Nothing was changed.',
    next: 'Open Bellkeep itself and try again.',
  },
  'too-many-requests': {
    status: 429,
    title: 'Too many requests',
    keeps: 'Nothing was stored.',
    next: 'Wait as long as Retry-After says, then repeat the same call.',
  },
  'enrolment-refused': {
    status: 403,
    title: 'The enrolment is not accepted',
    keeps: 'Nothing was stored. A wrong code counts as a try; after five the code is dead.',
    next: 'Check code and serial number, or print a new sheet at the bench.',
  },
  'device-not-in-service': {
    status: 403,
    title: 'The device is not in service',
    keeps: 'Clips on the device stay valid.',
    next: 'Take the device to biomedical engineering.',
  },
  'recording-conflict': {
    status: 409,
    title: 'This recording number was used for other content',
    keeps: 'The first one was kept.',
    next: 'Give each recording a number of its own.',
  },
  'media-type-refused': {
    status: 422,
    title: 'The device model does not send this media type',
    keeps: 'Nothing was stored.',
    next: 'Send a type listed in the profile, or ask biomedical engineering to correct the model.',
  },
  'recording-too-large': {
    status: 422,
    title: 'The recording is larger than its model allows',
    keeps: 'Nothing was stored.',
    next: 'Split the recording, or ask biomedical engineering to correct the model.',
  },
  'bytes-missing': {
    status: 409,
    title: 'The bytes have not arrived',
    keeps: 'The recording is still awaited.',
    next: 'Put the bytes to the presigned address, then complete again. Ask for a new slot when it has ended.',
  },
  'bytes-mismatch': {
    status: 422,
    title: 'The bytes are not the ones that were announced',
    keeps: 'They were kept in quarantine storage, never in the record.',
    next: 'Record again, with a new recording number.',
  },
  'slot-ended': {
    status: 409,
    title: 'The upload slot has ended',
    keeps: 'Nothing was lost on the device.',
    next: 'Ask for the slot again with the same recording number.',
  },
  'busy-elsewhere': {
    status: 409,
    title: 'The same recording is being completed by another call',
    keeps: 'The other call carries on.',
    next: 'Repeat the call after Retry-After.',
  },
  'storage-unavailable': {
    status: 503,
    title: 'Storage does not answer',
    keeps: 'What was received is kept.',
    next: 'Repeat the same call after Retry-After.',
  },
  stale: {
    status: 409,
    title: 'Somebody changed this in the meantime',
    keeps: 'Their change was kept, yours was not made.',
    next: 'Look at what changed and decide again.',
  },
  'already-filed': {
    status: 409,
    title: 'Somebody filed this recording first',
    keeps: 'The first filing stands.',
    next: 'Look where it was filed. Move it with a reason if that is wrong.',
  },
  'identifiers-mismatch': {
    status: 422,
    title: 'The identifiers do not belong to this patient',
    keeps: 'Nothing was filed.',
    next: 'Read two identifiers from the wristband again.',
  },
  'not-possible': {
    status: 409,
    title: 'That is not possible now',
    keeps: 'Nothing was changed.',
    next: 'See the detail.',
  },
  'idempotency-conflict': {
    status: 409,
    title: 'This idempotency key was used for another request',
    keeps: 'The first request stands.',
    next: 'Use a new key for a new request.',
  },
  fault: {
    status: 500,
    title: 'Something went wrong here',
    keeps: 'Nothing was half done. What was committed stays.',
    next: 'Repeat the same call. If it happens again, give the request id to IT.',
  },
} as const satisfies Record<string, ProblemKind>;

export type ProblemCode = keyof typeof PROBLEMS;

export interface ProblemDocument {
  type: string;
  title: string;
  status: number;
  detail?: string;
  instance?: string;
  requestId?: string;
  [member: string]: unknown;
}
