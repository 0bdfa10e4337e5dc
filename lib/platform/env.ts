import ipaddr from 'ipaddr.js';
import { z } from 'zod';

const bytes32 = (name: string) =>
  z.string().refine((value) => Buffer.from(value, 'base64').length === 32, {
    message: `${name} must be 32 random bytes in base64 (openssl rand -base64 32)`,
  });
const httpUrl = z.url({ protocol: /^https?$/ }).transform((value) => value.replace(/\/+$/, ''));

/** Every setting that Bellkeep reads from its environment, with what it is for. DEVELOPERS.md lists the same. */
export const EnvSchema = z.object({
  NODE_ENV: z.enum(['development', 'test', 'production']).default('development'),
  /** The address people and devices use, without a trailing slash. */
  BELLKEEP_ORIGIN: httpUrl,
  BELLKEEP_HOSPITAL: z.string().min(1).max(120).default('Harrowmere General Hospital'),
  /** The zone in which times are shown, an IANA name. */
  BELLKEEP_TIME_ZONE: z
    .string()
    .default('Europe/London')
    .refine(
      (zone) => Intl.supportedValuesOf('timeZone').includes(zone) || zone === 'UTC',
      'an IANA time zone such as Europe/London',
    ),
  /** The name on signed tree heads: a host and path without scheme. */
  BELLKEEP_CUSTODY_ORIGIN: z
    .string()
    .regex(
      /^[a-z0-9.-]+(\/[a-z0-9._-]+)*$/,
      'a host and path without scheme, such as bellkeep.example.org/custody',
    )
    .default('bellkeep.harrowmere.example/custody'),
  /** Key for private keys and second-factor secrets at rest. */
  BELLKEEP_SECRET_KEY: bytes32('BELLKEEP_SECRET_KEY'),
  /** Key for people's session cookies. */
  BELLKEEP_AUTH_SECRET: z.string().min(32, 'at least 32 characters'),
  DATABASE_URL: z
    .string()
    .regex(/^(file:|libsql:|https?:|wss?:)/, 'file:PATH or the address of a libSQL server')
    .default('file:.data/bellkeep.db'),
  DATABASE_AUTH_TOKEN: z.string().optional(),
  S3_ENDPOINT: httpUrl,
  /** The address of the store as devices and browsers see it, where it differs. */
  S3_PUBLIC_ENDPOINT: httpUrl.optional(),
  S3_REGION: z.string().default('us-east-1'),
  S3_BUCKET: z.string().min(3).max(63),
  S3_ACCESS_KEY_ID: z.string().min(1),
  S3_SECRET_ACCESS_KEY: z.string().min(1),
  /** smtp(s)://user:password@host:port. Without it, messages are written as files under MAIL_DIR. */
  SMTP_URL: z
    .string()
    .regex(/^smtps?:\/\//, 'smtp://… or smtps://…')
    .optional(),
  MAIL_DIR: z.string().default('.data/mail'),
  MAIL_FROM: z.string().default('Bellkeep <bellkeep@harrowmere.example>'),
  /** How long an original is locked in storage, in years. Local law and policy come first. */
  RETENTION_YEARS: z.coerce.number().int().min(1).max(100).default(8),
  /** Requests a minute that one device may make; people and addresses have limits of their own in code. */
  DEVICE_REQUESTS_PER_MINUTE: z.coerce.number().int().min(1).default(600),
  /** Proxies between people and Bellkeep whose X-Forwarded-For is believed. 0: none. */
  TRUSTED_PROXIES: z.coerce.number().int().min(0).max(5).default(0),
  /** Ranges inside that connections and webhooks may lead to all the same, such as 10.20.0.0/16. */
  PRIVATE_ADDRESSES_ALLOWED: z
    .string()
    .default('')
    .transform((text) => text.split(/[\s,]+/).filter(Boolean))
    .refine((ranges) => ranges.every((range) => ipaddr.isValidCIDR(range)), 'ranges such as 10.20.0.0/16'),
  /** FHIR R4 base address, unless one is set in the Key room. */
  RECORD_SYSTEM_URL: httpUrl.optional(),
  RECORD_SYSTEM_TOKEN: z.string().optional(),
  /** OpenID Connect, unless it is set in the Key room. */
  SIGN_ON_ISSUER: httpUrl.optional(),
  SIGN_ON_CLIENT_ID: z.string().optional(),
  SIGN_ON_CLIENT_SECRET: z.string().optional(),
  SIGN_ON_NAME: z.string().min(1).max(60).default('the hospital’s account'),
  /** `provider`: its second factor is believed. `own`: ours is asked for too. */
  SIGN_ON_SECOND_FACTOR: z.enum(['own', 'provider']).default('own'),
  LOG_LEVEL: z.enum(['trace', 'debug', 'info', 'warn', 'error', 'fatal', 'silent']).default('info'),
});

export type Env = z.infer<typeof EnvSchema>;

/**
 * Read the environment once.
 *
 * @throws Error naming every setting that is wrong and what it should be
 */
export function readEnv(source: Record<string, string | undefined>): Env {
  const present = Object.fromEntries(Object.entries(source).filter(([, value]) => value !== ''));
  const result = EnvSchema.safeParse(present);
  if (result.success) return result.data;
  const lines = result.error.issues.map((issue) => {
    const name = issue.path.join('.');
    return `  ${name}: ${present[name] === undefined ? 'missing' : issue.message}`;
  });
  throw new Error(`The environment is not right:\n${lines.join('\n')}\nDEVELOPERS.md lists every setting.`);
}
