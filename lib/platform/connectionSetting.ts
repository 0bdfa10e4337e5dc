import { eq } from 'drizzle-orm';
import { z } from 'zod';
import type { Reader } from '@/db/client';
import { connectionSetting } from '@/db/schema';
import type { Tx } from '@/db/write';
import type { Services } from './services';

const address = z
  .string()
  .trim()
  .max(500)
  .pipe(z.url({ protocol: /^https?$/, error: 'This is no web address.' }))
  .transform((text) => text.replace(/\/+$/, ''));

/** Settings of the systems that are set in the Key room, without their secret. */
export const CONNECTION_SETTINGS = {
  /** FHIR R4. */
  'record-system': z.strictObject({ baseUrl: address }),
  /** OpenID Connect. */
  'single-sign-on': z.strictObject({
    issuer: address,
    clientId: z.string().trim().min(1, 'Needed.').max(300),
    /** What the button says. */
    name: z.string().trim().min(1, 'Needed.').max(60),
    /** Believe the provider when it says that it asked for a second factor (RFC 8176, `mfa`). */
    providerSecondFactor: z.boolean(),
  }),
} as const;

export type SettableConnection = keyof typeof CONNECTION_SETTINGS;
export type ConnectionSettings<K extends SettableConnection> = z.infer<(typeof CONNECTION_SETTINGS)[K]>;

export interface SetConnection<K extends SettableConnection> {
  settings: ConnectionSettings<K>;
  secret: string | null;
  /** 0: from the environment. */
  version: number;
}

export const connectionBox = (kind: SettableConnection) => `connection ${kind}`;

/** The row of a connection that was set in the Key room. */
export async function connectionRow(read: Reader | Tx, kind: SettableConnection) {
  const [row] = await read.select().from(connectionSetting).where(eq(connectionSetting.kind, kind)).limit(1);
  return row ?? null;
}

/** How a system is reached: as set in the Key room, else as the environment says; null where neither says. */
export async function readConnection<K extends SettableConnection>(
  services: Pick<Services, 'read' | 'env' | 'secrets'>,
  kind: K,
): Promise<SetConnection<K> | null> {
  const row = await connectionRow(services.read, kind);
  if (!row) return fromEnvironment(services, kind);
  // Emptied in the Key room: not reached at all.
  if (Object.keys(row.settings).length === 0) return null;
  return {
    settings: CONNECTION_SETTINGS[kind].parse(row.settings) as ConnectionSettings<K>,
    secret: row.sealedSecret === null ? null : services.secrets.open(row.sealedSecret, connectionBox(kind)),
    version: row.version,
  };
}

function fromEnvironment<K extends SettableConnection>(
  { env }: Pick<Services, 'env'>,
  kind: K,
): SetConnection<K> | null {
  const found: {
    [S in SettableConnection]: { settings: Record<string, unknown>; secret: string | null } | null;
  } = {
    'record-system': env.RECORD_SYSTEM_URL
      ? { settings: { baseUrl: env.RECORD_SYSTEM_URL }, secret: env.RECORD_SYSTEM_TOKEN ?? null }
      : null,
    'single-sign-on':
      env.SIGN_ON_ISSUER && env.SIGN_ON_CLIENT_ID
        ? {
            settings: {
              issuer: env.SIGN_ON_ISSUER,
              clientId: env.SIGN_ON_CLIENT_ID,
              name: env.SIGN_ON_NAME,
              providerSecondFactor: env.SIGN_ON_SECOND_FACTOR === 'provider',
            },
            secret: env.SIGN_ON_CLIENT_SECRET ?? null,
          }
        : null,
  };
  const one = found[kind];
  if (!one) return null;
  return {
    settings: CONNECTION_SETTINGS[kind].parse(one.settings) as ConnectionSettings<K>,
    secret: one.secret,
    version: 0,
  };
}
