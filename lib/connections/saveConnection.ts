import { z } from 'zod';
import { connectionSetting } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { type Authorized, personActor } from '@/lib/platform/authority';
import {
  CONNECTION_SETTINGS,
  connectionBox,
  connectionRow,
  type SettableConnection,
} from '@/lib/platform/connectionSetting';
import { Refusal } from '@/lib/platform/errors';
import { OutsideError, parseOutsideUrl, resolveOutside } from '@/lib/platform/outside';
import type { Services } from '@/lib/platform/services';

export const ConnectionChange = z.strictObject({
  /** Empty: not reached any more. */
  settings: z.record(z.string(), z.unknown()),
  /** Left out: the one before stays. null: none. */
  secret: z.string().trim().min(1).max(4000).nullable().optional(),
  version: z.number().int().min(0),
  reason: z.string().trim().min(5, 'A reason of at least five letters is needed.').max(500),
});
export type ConnectionChange = z.infer<typeof ConnectionChange>;

interface Saved {
  version: number;
}

const isSettable = (kind: string): kind is SettableConnection => Object.hasOwn(CONNECTION_SETTINGS, kind);

function checkedSettings(kind: SettableConnection, given: Record<string, unknown>): Record<string, unknown> {
  if (Object.keys(given).length === 0) return {};
  const parsed = CONNECTION_SETTINGS[kind].safeParse(given);
  if (parsed.success) return parsed.data;
  throw new Refusal('body-invalid', 'These settings are not right.', {
    errors: parsed.error.issues.map(({ path, message }) => ({ path: `settings.${path.join('.')}`, message })),
  });
}

/** An address that leads inside is refused when it is typed, and again whenever it is called. */
async function checkAddress(
  services: Pick<Services, 'env'>,
  settings: Record<string, unknown>,
): Promise<void> {
  const field = 'baseUrl' in settings ? 'baseUrl' : 'issuer';
  const address = settings[field];
  if (typeof address !== 'string') return;
  try {
    await resolveOutside(parseOutsideUrl(address), services.env);
  } catch (error) {
    if (!(error instanceof OutsideError)) throw error;
    // A name that does not resolve now may do so tomorrow; the test says so.
    if (error.code === 'not-found') return;
    throw new Refusal('body-invalid', error.message, {
      errors: [{ path: `settings.${field}`, message: error.message }],
    });
  }
}

/**
 * Set how another system is reached. The secret is sealed and never shown again.
 *
 * @throws Refusal `not-found` for what is not set here, `body-invalid`, `stale`
 */
export async function saveConnection(
  services: Pick<Services, 'write' | 'clock' | 'env' | 'secrets'>,
  by: Authorized<'connections.write'>,
  kind: string,
  wanted: ConnectionChange,
  remember?: (tx: Tx, answer: Saved) => Promise<void>,
): Promise<Saved> {
  if (!isSettable(kind)) throw new Refusal('not-found');
  const settings = checkedSettings(kind, wanted.settings);
  await checkAddress(services, settings);
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const before = await connectionRow(tx, kind);
    if ((before?.version ?? 0) !== wanted.version)
      throw new Refusal('stale', 'Somebody changed this connection in the meantime.', {
        version: before?.version ?? 0,
      });
    const emptied = Object.keys(settings).length === 0;
    const sealedSecret = emptied
      ? null
      : wanted.secret === undefined
        ? (before?.sealedSecret ?? null)
        : wanted.secret === null
          ? null
          : services.secrets.seal(wanted.secret, connectionBox(kind));
    const row = { settings, sealedSecret, changedBy: by.id, changedAt: now, version: wanted.version + 1 };
    await tx
      .insert(connectionSetting)
      .values({ kind, ...row })
      .onConflictDoUpdate({ target: connectionSetting.kind, set: row });
    await appendEntries(tx, now, [
      {
        kind: 'connection-changed',
        actor: personActor(by, 'connections.write'),
        subjects: [{ kind: 'connection', id: kind }],
        detail: { connection: kind, reason: wanted.reason, secretChanged: wanted.secret !== undefined },
        before: { ...before?.settings },
        after: settings,
      },
    ]);
    const answer = { version: row.version };
    await remember?.(tx, answer);
    return answer;
  });
}
