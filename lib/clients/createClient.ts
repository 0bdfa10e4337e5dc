import { importJWK, type JWK } from 'jose';
import { z } from 'zod';
import { apiClient } from '@/db/schema';
import type { Tx } from '@/db/write';
import { SCOPE_NAMES } from '@/lib/contract/scopes';
import { appendEntries } from '@/lib/custody/append';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import { newId, newSecret } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';
import { ASSERTION_ALGORITHMS } from './authenticateClient';
import { secretHash } from './secretHash';

const PublicKeys = z.strictObject({
  keys: z.array(z.record(z.string(), z.unknown())).min(1, 'At least one key.').max(10),
});

export const NewClient = z.strictObject({
  name: z
    .string()
    .trim()
    .min(1, 'A name is needed.')
    .max(80)
    .regex(/^[^\p{C}]*$/u, 'It holds characters that cannot be seen.'),
  scopes: z
    .array(z.enum(SCOPE_NAMES))
    .min(1, 'Choose at least one.')
    .transform((scopes) => SCOPE_NAMES.filter((scope) => scopes.includes(scope))),
  /** A key set of public keys: it signs in with those (RFC 7523) and gets no secret. */
  publicKeys: PublicKeys.nullable(),
});
export type NewClient = z.infer<typeof NewClient>;

export interface CreatedClient {
  clientId: string;
  /** Shown in this answer alone; null for a client with keys, and in the answer to a repeat. */
  secret: string | null;
}

const keyError = (message: string) =>
  new Refusal('body-invalid', message, { errors: [{ path: 'publicKeys', message }] });

/** Public keys of a kind that may sign assertions, and nothing private among them. */
async function checkKeys(keys: Record<string, unknown>[]): Promise<void> {
  for (const key of keys) {
    if (['d', 'p', 'q', 'k'].some((member) => member in key))
      throw keyError('One of these keys is private. Make a new pair: this one is no secret any more.');
    const algorithm =
      typeof key.alg === 'string' ? key.alg : { EC: 'ES256', OKP: 'EdDSA', RSA: 'PS256' }[String(key.kty)];
    if (!algorithm || !ASSERTION_ALGORITHMS.includes(algorithm))
      throw keyError('A key is of a kind that is not taken: P-256, Ed25519 or RSA.');
    await importJWK(key as JWK, algorithm).catch(() => {
      throw keyError('One of these is no public key.');
    });
  }
}

/**
 * Let another system read: with a secret, or with keys of its own.
 *
 * @throws Refusal `body-invalid`
 */
export async function createClient(
  services: Pick<Services, 'write' | 'clock'>,
  by: Authorized<'connections.write'>,
  wanted: NewClient,
  remember?: (tx: Tx, answer: CreatedClient) => Promise<void>,
): Promise<CreatedClient> {
  if (wanted.publicKeys) await checkKeys(wanted.publicKeys.keys);
  const now = services.clock.now();
  const secret = wanted.publicKeys ? null : newSecret();
  const id = newId();
  return await services.write(async (tx) => {
    await tx.insert(apiClient).values({
      id,
      name: wanted.name,
      scopes: wanted.scopes,
      method: secret ? 'client_secret_basic' : 'private_key_jwt',
      secretHash: secret ? secretHash(secret) : null,
      publicKeys: wanted.publicKeys,
      createdBy: by.id,
      createdAt: now,
    });
    await appendEntries(tx, now, [
      {
        kind: 'client-created',
        actor: personActor(by, 'connections.write'),
        subjects: [{ kind: 'client', id }],
        detail: { name: wanted.name, scopes: wanted.scopes, method: secret ? 'secret' : 'keys' },
      },
    ]);
    // What a repeat is answered is kept: never a secret.
    await remember?.(tx, { clientId: id, secret: null });
    return { clientId: id, secret };
  });
}
