import type { z } from 'zod';
import {
  CompleteAnswer,
  CompleteRequest,
  CredentialAnswer,
  EnrolRequest,
  HeartbeatAnswer,
  HeartbeatRequest,
  RenewRequest,
  SlotAnswer,
  SlotRequest,
} from './device';
import type { ProblemCode } from './problems';

export interface Operation {
  /** `operationId`, and the anchor on the page for device makers. */
  id: string;
  path: string;
  summary: string;
  /** What a device maker must know of it, in sentences. */
  description: string;
  /** A credential and, where it is bound, a proof go with the call. */
  authenticated: boolean;
  body: z.ZodType;
  answers: { status: 200 | 201; when: string; schema: z.ZodType }[];
  /** All it may refuse with. */
  problems: ProblemCode[];
}

const EVERY: ProblemCode[] = [
  'body-invalid',
  'body-too-large',
  'media-type-unsupported',
  'too-many-requests',
  'fault',
];
const OF_A_DEVICE: ProblemCode[] = ['token-invalid', 'proof-invalid', 'use-dpop-nonce', ...EVERY];

/** What a device can ask for, in the order in which it first does. */
export const DEVICE_OPERATIONS: Operation[] = [
  {
    id: 'enrol',
    path: '/api/device/v1/enrol',
    summary: 'Hand over the public key and get the first credential',
    description:
      'The device makes a key pair, and sends the public half with the one-time code of its enrolment sheet and a proof that it holds the private half. A device that got no answer repeats the call with the same code and key, and gets the same credential.',
    authenticated: false,
    body: EnrolRequest,
    answers: [
      { status: 201, when: 'Enrolled.', schema: CredentialAnswer },
      { status: 200, when: 'The same credential again, to a repeated call.', schema: CredentialAnswer },
    ],
    problems: ['enrolment-refused', ...EVERY],
  },
  {
    id: 'heartbeat',
    path: '/api/device/v1/heartbeat',
    summary: 'Say how the device is, and hear the time',
    description:
      'About once a minute while the device is on. The answer tells the time, whether to renew, and which listening session the device is in.',
    authenticated: true,
    body: HeartbeatRequest,
    answers: [{ status: 200, when: 'Heard.', schema: HeartbeatAnswer }],
    problems: OF_A_DEVICE,
  },
  {
    id: 'slot',
    path: '/api/device/v1/recordings',
    summary: 'Ask for an upload slot for one recording',
    description:
      'Answers with a presigned address that takes exactly the announced bytes, for five minutes. The same request again gets the same recording with a fresh address, or none when the bytes are safe already. The same recording number with other content is refused, and the first stays.',
    authenticated: true,
    body: SlotRequest,
    answers: [
      { status: 201, when: 'Admitted.', schema: SlotAnswer },
      { status: 200, when: 'Admitted before: the same recording again.', schema: SlotAnswer },
    ],
    problems: [
      'device-not-in-service',
      'media-type-refused',
      'recording-too-large',
      'recording-conflict',
      'bytes-mismatch',
      ...OF_A_DEVICE,
    ],
  },
  {
    id: 'complete',
    path: '/api/device/v1/recordings/{recording}/complete',
    summary: 'The bytes are put: get the verdict',
    description:
      'Bellkeep checks length and SHA-256, seals the original, measures it, files it and answers with the verdict and its reasons, so that the device can say “record again” at the bedside. It carries on from the last step that is done: repeat it as often as you like.',
    authenticated: true,
    body: CompleteRequest,
    answers: [{ status: 200, when: 'Measured, and filed where something ties it.', schema: CompleteAnswer }],
    problems: ['not-found', 'bytes-missing', 'bytes-mismatch', 'storage-unavailable', ...OF_A_DEVICE],
  },
  {
    id: 'renew',
    path: '/api/device/v1/token',
    summary: 'Renew the credential',
    description:
      'With the old credential and its key. The old one keeps working until the new one is first used, at the longest for the overlap. A repeated call gets the same successor.',
    authenticated: true,
    body: RenewRequest,
    answers: [
      { status: 201, when: 'Renewed.', schema: CredentialAnswer },
      { status: 200, when: 'The same successor again, to a repeated call.', schema: CredentialAnswer },
    ],
    problems: OF_A_DEVICE,
  },
];
