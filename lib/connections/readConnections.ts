import { eq } from 'drizzle-orm';
import { connectionCheck, user } from '@/db/schema';
import type { Authorized } from '@/lib/platform/authority';
import { connectionRow, readConnection, type SettableConnection } from '@/lib/platform/connectionSetting';
import type { Services } from '@/lib/platform/services';
import type { CheckStep } from '@/lib/storage/port';
import { CONNECTIONS, type ConnectionKind } from './tests';

export interface ConnectionLine {
  kind: ConnectionKind;
  /** What is set, without secrets. */
  facts: { term: string; value: string }[];
  /** Where it is set; null: nowhere. */
  source: 'environment' | 'keyroom' | null;
  /** For a form, where it is set here. */
  settable: { settings: Record<string, unknown>; hasSecret: boolean; version: number } | null;
  check: { ok: boolean; steps: CheckStep[]; at: number; by: string } | null;
}

type Needs = Pick<Services, 'read' | 'env' | 'secrets' | 'mail'>;

/** The mail server without the password in its address. */
function mailServer(services: Needs): string {
  const { SMTP_URL, MAIL_DIR } = services.env;
  if (!SMTP_URL) return `files under ${MAIL_DIR}`;
  const url = new URL(SMTP_URL);
  return `${url.protocol}//${url.host}`;
}

async function settable(
  services: Needs,
  kind: SettableConnection,
): Promise<Pick<ConnectionLine, 'facts' | 'source' | 'settable'>> {
  const found = await readConnection(services, kind);
  const row = await connectionRow(services.read, kind);
  const settings: Record<string, unknown> = found?.settings ?? {};
  const words: Record<string, string> = {
    baseUrl: 'FHIR base address',
    issuer: 'Issuer',
    clientId: 'Client id',
    name: 'Name on the button',
    providerSecondFactor: 'Its second factor is believed',
  };
  const facts = Object.entries(settings).map(([name, value]) => ({
    term: words[name] ?? name,
    value: typeof value === 'boolean' ? (value ? 'yes' : 'no') : String(value),
  }));
  return {
    facts: found ? [...facts, { term: 'Secret', value: found.secret ? 'set' : 'none' }] : [],
    source: found ? (found.version === 0 ? 'environment' : 'keyroom') : null,
    settable: { settings, hasSecret: (found?.secret ?? null) !== null, version: row?.version ?? 0 },
  };
}

/** Every connection with what is set and what its last test found. */
export async function readConnections(
  services: Needs,
  _by: Authorized<'connections.read'>,
): Promise<ConnectionLine[]> {
  const { env } = services;
  const checks = await services.read
    .select({ check: connectionCheck, by: user.name })
    .from(connectionCheck)
    .innerJoin(user, eq(user.id, connectionCheck.checkedBy));
  const fixed = (facts: ConnectionLine['facts']) => ({
    facts,
    source: 'environment' as const,
    settable: null,
  });
  const parts: Record<ConnectionKind, Pick<ConnectionLine, 'facts' | 'source' | 'settable'>> = {
    storage: fixed([
      { term: 'Endpoint', value: env.S3_ENDPOINT },
      { term: 'Bucket', value: env.S3_BUCKET },
      { term: 'Region', value: env.S3_REGION },
    ]),
    mail: fixed([
      { term: 'Goes to', value: mailServer(services) },
      { term: 'From', value: env.MAIL_FROM },
    ]),
    'record-system': await settable(services, 'record-system'),
    'single-sign-on': await settable(services, 'single-sign-on'),
  };
  return CONNECTIONS.map((kind) => {
    const found = checks.find(({ check }) => check.kind === kind);
    return {
      kind,
      ...parts[kind],
      check: found
        ? { ok: found.check.ok, steps: found.check.steps, at: found.check.checkedAt, by: found.by }
        : null,
    };
  });
}
