import { z } from 'zod';
import { SITE_IDS } from './sites';

/**
 * Schemas of the device API, version 1: the only thing that routes, the reference device and the documentation share.
 * Each member says its unit and what it is for; the OpenAPI document and the page for device makers are made of that.
 */

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
const moment = (description: string) => utcMs.meta({ description: `${description} UTC milliseconds.` });
const said = <S extends z.ZodType>(schema: S, description: string): S => schema.meta({ description });

export const PublicJwk = z
  .discriminatedUnion('kty', [
    z.strictObject({
      kty: z.literal('OKP'),
      crv: z.literal('Ed25519'),
      x: said(base64url(32), 'Public key, 32 bytes in base64url without padding.'),
    }),
    z.strictObject({
      kty: z.literal('EC'),
      crv: z.literal('P-256'),
      x: said(base64url(32), 'X coordinate, 32 bytes in base64url without padding.'),
      y: said(base64url(32), 'Y coordinate, 32 bytes in base64url without padding.'),
    }),
  ])
  .meta({
    id: 'PublicKey',
    description:
      'The device’s public key: Ed25519 (RFC 8037, 2) or P-256 (RFC 7518, 6.2.1). The private half never leaves the device.',
  });
export type PublicJwk = z.infer<typeof PublicJwk>;

export const ENROLMENT_PROOF_TYPE = 'enrolment-proof+jwt';
export const ENROLMENT_CODE = /^[2-9A-HJKMNP-TV-Z]{10}$/;

export const EnrolRequest = z
  .strictObject({
    code: z
      .string()
      .max(40)
      .transform((code) => code.toUpperCase().replace(/[\s-]/g, ''))
      .pipe(z.string().regex(ENROLMENT_CODE, 'ten characters from the enrolment sheet'))
      .meta({
        description:
          'The one-time code on the enrolment sheet: ten letters and digits. Case, spaces and hyphens do not matter.',
        examples: ['7K3F-92QX-4M'],
      }),
    serialNumber: said(printable(64), 'As engraved on the device and listed at the bench.'),
    publicKey: PublicJwk,
    proof: z.string().max(4096).meta({
      description:
        'Compact JWS by the private half: header {alg: EdDSA or ES256, typ: enrolment-proof+jwt}, payload {aud: origin of the service, sub: serial number, code: the code}.',
    }),
    firmware: said(printable(64).optional(), 'Version that runs on the device.'),
  })
  .meta({ id: 'EnrolRequest' });
export type EnrolRequest = z.infer<typeof EnrolRequest>;

export const CredentialAnswer = z
  .object({
    deviceId: said(z.string(), 'Ours for the device; it does not change.'),
    assetTag: said(z.string(), 'What the hospital calls the device, such as HM-0344.'),
    credentialId: said(z.string(), 'The name people use for this credential.'),
    token: said(z.string(), 'The access token (RFC 9068). Keep it like a key; send it with every call.'),
    tokenType: z.enum(['DPoP', 'Bearer']).meta({
      description:
        'DPoP: bound to the device’s key, each call carries a proof (RFC 9449). Bearer: only for models that cannot sign.',
    }),
    expiresAt: moment('Until when the token is accepted.'),
    renewAfter: moment('From here on the device should renew.'),
    serverTime: moment('What the clock of the service says.'),
  })
  .meta({ id: 'Credential' });
export type CredentialAnswer = z.infer<typeof CredentialAnswer>;

export const RenewRequest = z.strictObject({}).meta({ id: 'RenewRequest', description: 'Empty.' });

export const HeartbeatRequest = z
  .strictObject({
    batteryPercent: said(z.number().int().min(0).max(100).optional(), 'Charge, percent.'),
    firmware: said(printable(64).optional(), 'Version that runs on the device.'),
    deviceTime: moment('What the device’s clock says now. It may be years off.'),
    queued: z
      .number()
      .int()
      .min(0)
      .max(1_000_000)
      .optional()
      .meta({ description: 'Clips waiting on the device.' }),
  })
  .meta({ id: 'HeartbeatRequest' });
export type HeartbeatRequest = z.infer<typeof HeartbeatRequest>;

export const HeartbeatAnswer = z
  .object({
    serverTime: moment('What the clock of the service says.'),
    clockOffsetMs: said(z.number().int(), 'Device clock minus ours, milliseconds.'),
    renew: said(z.boolean(), 'Renew the credential with the next call.'),
    state: said(z.string(), 'Service state of the device, such as in-service or quarantined.'),
    session: z
      .object({
        number: said(z.string(), 'Number of the listening session.'),
        encounter: said(z.string(), 'Number of the encounter that clips are filed to.'),
      })
      .nullable()
      .meta({ description: 'The listening session that is open on this device, or null.' }),
  })
  .meta({ id: 'Heartbeat' });
export type HeartbeatAnswer = z.infer<typeof HeartbeatAnswer>;

/** 4 GiB less one byte: what a RIFF size can say. */
export const LARGEST_RECORDING_BYTES = 2 ** 32 - 1;

export const SlotRequest = z
  .strictObject({
    recordingNumber: printable(64).meta({
      description:
        'The device’s own number for this recording, never used for another: the idempotency key of all that follows.',
    }),
    sha256: said(
      z.string().regex(/^[0-9a-f]{64}$/, 'SHA-256 in lower-case hex'),
      'SHA-256 of the file, lower-case hex.',
    ),
    bytes: said(z.number().int().min(0).max(LARGEST_RECORDING_BYTES), 'Length of the file, bytes.'),
    mediaType: z
      .string()
      .max(100)
      .regex(/^[a-z0-9][a-z0-9!#$&^_.+-]*\/[a-z0-9][a-z0-9!#$&^_.+-]*$/, 'a media type without parameters')
      .meta({ description: 'Media type of the file, without parameters.', examples: ['audio/wav'] }),
    recordedAt: moment('When recording began, by the device’s clock.'),
    deviceTime: moment('What the device’s clock says now; recorded times are corrected by the difference.'),
    site: said(z.enum(SITE_IDS).optional(), 'Where on the body the chestpiece was put.'),
    chestpieceSide: said(z.enum(['bell', 'diaphragm']).optional(), 'Side of the chestpiece that listened.'),
    gainStep: said(z.number().int().min(-20).max(20).optional(), 'Position of the gain control, steps.'),
    filter: said(printable(32).optional(), 'Name of the filter that was on, by the device’s own naming.'),
    scannedIdentifier: printable(64)
      .optional()
      .meta({ description: 'What was scanned: the record number of a wristband, or an encounter number.' }),
  })
  .meta({ id: 'SlotRequest' });
export type SlotRequest = z.infer<typeof SlotRequest>;

export const UploadTarget = z
  .object({
    method: z.literal('PUT'),
    url: said(z.string(), 'The address that takes the bytes. It is a secret: whoever has it may use it.'),
    headers: said(z.record(z.string(), z.string()), 'Header fields to send exactly so.'),
    expiresAt: moment('Until when the address works.'),
  })
  .meta({ id: 'UploadTarget' });

export const Finding = z
  .object({
    code: said(z.string(), 'Stable name of the finding, such as clipped or hum.'),
    severity: z.enum(['note', 'care', 'repeat']),
    value: said(z.number().optional(), 'What was measured, in `unit`.'),
    unit: z.string().optional(),
    threshold: said(z.number().optional(), 'The limit it was held against, in `unit`.'),
    from: said(z.number().optional(), 'Where it begins, seconds from the start.'),
    to: said(z.number().optional(), 'Where it ends, seconds from the start.'),
    channel: said(z.number().int().optional(), 'Zero-based channel, where it is about one.'),
  })
  .meta({ id: 'Finding', description: 'One technical observation on the recording.' });

export const VerdictWord = z.enum(['usable', 'care', 'repeat']).meta({
  description:
    'usable; care: use with care; repeat: record again. Technical quality only, never a diagnosis.',
});

export const CompleteAnswer = z
  .object({
    recording: said(z.string(), 'Our number for it.'),
    stage: said(
      z.enum(['measured', 'filed']),
      'filed: it is in an encounter. measured: it waits in the tray.',
    ),
    verdict: VerdictWord,
    reasons: z
      .array(
        z.object({
          code: z.string(),
          severity: z.string(),
          title: said(z.string(), 'What was found, in a few words for the device’s screen.'),
          meaning: said(z.string(), 'What it means, one sentence.'),
          action: said(z.string(), 'What to do about it, one sentence.'),
        }),
      )
      .meta({ description: 'The findings in words, the worst first.' }),
    sha256: said(z.string(), 'SHA-256 of the sealed original, lower-case hex.'),
    durationSeconds: said(
      z.number().nullable(),
      'Length of the sound, seconds; null where it could not be read.',
    ),
    findings: z.array(Finding),
    measures: said(
      z.record(z.string(), z.unknown()).nullable(),
      'All that was measured, by name with its unit.',
    ),
    filing: z
      .object({ encounter: z.string(), by: z.enum(['session', 'identifier', 'person']) })
      .nullable()
      .meta({ description: 'Where it was filed and what tied it there; null: in the tray.' }),
    custodyEntries: said(z.number().int(), 'Entries in the custody thread of this recording.'),
    renew: said(z.boolean(), 'Renew the credential with the next call.'),
  })
  .meta({ id: 'Verdict' });
export type CompleteAnswer = z.infer<typeof CompleteAnswer>;

export const SlotAnswer = z
  .object({
    recording: z.string().meta({ description: 'Our number for it, such as 7K3F-92QX.' }),
    repeated: said(z.boolean(), 'This recording number was admitted before with the same content.'),
    upload: UploadTarget.nullable().meta({
      description: 'Where the bytes go; null when they are already safe: just complete.',
    }),
    complete: said(z.string(), 'The address to post to when the bytes are put.'),
    renew: said(z.boolean(), 'Renew the credential with the next call.'),
  })
  .meta({ id: 'Slot' });
export type SlotAnswer = z.infer<typeof SlotAnswer>;

export const CompleteRequest = z.strictObject({}).meta({ id: 'CompleteRequest', description: 'Empty.' });
