import { z } from 'zod';
import { SITE_IDS } from './sites';

/** Schemas of the device API, version 1: the only thing that routes, the reference device and the documentation share. */

const base64url = (bytes: number) =>
  z
    .string()
    .regex(new RegExp(`^[A-Za-z0-9_-]{${Math.ceil((bytes * 4) / 3)}}$`), `base64url of ${bytes} bytes`);
const printable = (max: number) =>
  z
    .string()
    .trim()
    .min(1)
    .max(max)
    .regex(/^[^\p{C}]*$/u, 'no control characters');
/** UTC milliseconds; a device clock may be years off, so any date of this era is admitted. */
const utcMs = z.number().int().min(0).max(4_102_444_800_000);

export const PublicJwk = z
  .discriminatedUnion('kty', [
    z.strictObject({ kty: z.literal('OKP'), crv: z.literal('Ed25519'), x: base64url(32) }),
    z.strictObject({ kty: z.literal('EC'), crv: z.literal('P-256'), x: base64url(32), y: base64url(32) }),
  ])
  .meta({ description: 'The device’s public key: Ed25519 (RFC 8037) or P-256 (RFC 7518)' });
export type PublicJwk = z.infer<typeof PublicJwk>;

export const ENROLMENT_PROOF_TYPE = 'enrolment-proof+jwt';
export const ENROLMENT_CODE = /^[2-9A-HJKMNP-TV-Z]{10}$/;

export const EnrolRequest = z.strictObject({
  code: z
    .string()
    .max(40)
    .transform((code) => code.toUpperCase().replace(/[\s-]/g, ''))
    .pipe(z.string().regex(ENROLMENT_CODE, 'ten characters from the enrolment sheet'))
    .meta({
      description: 'The one-time code on the enrolment sheet; case, spaces and hyphens do not matter',
    }),
  serialNumber: printable(64),
  publicKey: PublicJwk,
  proof: z.string().max(4096).meta({
    description:
      'Compact JWS by the private half: header {alg: EdDSA|ES256, typ: enrolment-proof+jwt}, payload {aud: service origin, sub: serial number, code}',
  }),
  firmware: printable(64).optional(),
});
export type EnrolRequest = z.infer<typeof EnrolRequest>;

export const CredentialAnswer = z.object({
  deviceId: z.string(),
  assetTag: z.string(),
  credentialId: z.string(),
  token: z.string(),
  tokenType: z.enum(['DPoP', 'Bearer']),
  expiresAt: utcMs,
  renewAfter: utcMs.meta({ description: 'From here on the device should renew' }),
  serverTime: utcMs,
});
export type CredentialAnswer = z.infer<typeof CredentialAnswer>;

export const RenewRequest = z.strictObject({});

export const HeartbeatRequest = z.strictObject({
  batteryPercent: z.number().int().min(0).max(100).optional(),
  firmware: printable(64).optional(),
  deviceTime: utcMs.meta({ description: 'What the device’s clock says now' }),
  queued: z
    .number()
    .int()
    .min(0)
    .max(1_000_000)
    .optional()
    .meta({ description: 'Clips waiting on the device' }),
});
export type HeartbeatRequest = z.infer<typeof HeartbeatRequest>;

export const HeartbeatAnswer = z.object({
  serverTime: utcMs,
  clockOffsetMs: z.number().int(),
  renew: z.boolean(),
  state: z.string(),
  session: z.object({ number: z.string(), encounter: z.string() }).nullable(),
});
export type HeartbeatAnswer = z.infer<typeof HeartbeatAnswer>;

/** 4 GiB less one byte: what a RIFF size can say. */
export const LARGEST_RECORDING_BYTES = 2 ** 32 - 1;

export const SlotRequest = z.strictObject({
  recordingNumber: printable(64).meta({
    description: 'The device’s own number for this recording: the idempotency key',
  }),
  sha256: z.string().regex(/^[0-9a-f]{64}$/, 'SHA-256 in lower-case hex'),
  bytes: z.number().int().min(0).max(LARGEST_RECORDING_BYTES),
  mediaType: z
    .string()
    .max(100)
    .regex(/^[a-z0-9][a-z0-9!#$&^_.+-]*\/[a-z0-9][a-z0-9!#$&^_.+-]*$/, 'a media type without parameters'),
  recordedAt: utcMs.meta({ description: 'When recording began, by the device’s clock' }),
  deviceTime: utcMs.meta({ description: 'What the device’s clock says now' }),
  site: z.enum(SITE_IDS).optional(),
  chestpieceSide: z.enum(['bell', 'diaphragm']).optional(),
  gainStep: z.number().int().min(-20).max(20).optional(),
  filter: printable(32).optional(),
  scannedIdentifier: printable(64)
    .optional()
    .meta({ description: 'Wristband record number or encounter number' }),
});
export type SlotRequest = z.infer<typeof SlotRequest>;

export const UploadTarget = z.object({
  method: z.literal('PUT'),
  url: z.string(),
  headers: z.record(z.string(), z.string()),
  expiresAt: utcMs,
});

export const Finding = z.object({
  code: z.string(),
  severity: z.enum(['note', 'care', 'repeat']),
  value: z.number().optional(),
  unit: z.string().optional(),
  threshold: z.number().optional(),
  from: z.number().optional(),
  to: z.number().optional(),
  channel: z.number().int().optional(),
});

export const VerdictWord = z.enum(['usable', 'care', 'repeat']);

export const CompleteAnswer = z.object({
  recording: z.string(),
  stage: z.enum(['measured', 'filed']),
  verdict: VerdictWord,
  reasons: z.array(
    z.object({
      code: z.string(),
      severity: z.string(),
      title: z.string(),
      meaning: z.string(),
      action: z.string(),
    }),
  ),
  sha256: z.string(),
  durationSeconds: z.number().nullable(),
  findings: z.array(Finding),
  measures: z.record(z.string(), z.unknown()).nullable(),
  filing: z.object({ encounter: z.string(), by: z.enum(['session', 'identifier', 'person']) }).nullable(),
  custodyEntries: z.number().int(),
  renew: z.boolean(),
});
export type CompleteAnswer = z.infer<typeof CompleteAnswer>;

export const SlotAnswer = z.object({
  recording: z.string().meta({ description: 'Our number for it, such as 7K3F-92QX' }),
  repeated: z.boolean(),
  upload: UploadTarget.nullable().meta({
    description: 'null when the bytes are already safe: just complete',
  }),
  complete: z.string(),
  renew: z.boolean(),
});
export type SlotAnswer = z.infer<typeof SlotAnswer>;

export const CompleteRequest = z.strictObject({});
