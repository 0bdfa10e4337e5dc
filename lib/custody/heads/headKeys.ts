import { asc, eq } from 'drizzle-orm';
import { z } from 'zod';
import { signingKey } from '@/db/schema';
import type { Services } from '@/lib/platform/services';
import { fromHex } from '../pure/hash';
import { verifierKey } from '../pure/note';

const PublicJwk = z.object({ kty: z.literal('OKP'), crv: z.literal('Ed25519'), x: z.string() });

/** The 32 bytes of an Ed25519 public key (RFC 8037, 2). */
export function publicKeyOf(publicJwk: string): Uint8Array {
  const { x } = PublicJwk.parse(JSON.parse(publicJwk));
  return fromHex(Buffer.from(x, 'base64url').toString('hex')) ?? new Uint8Array(0);
}

export interface HeadKey {
  kid: string;
  /** Verifier key string (C2SP signed-note). */
  verifier: string;
  createdAt: number;
  supersededAt: number | null;
  compromisedAt: number | null;
}

/** Every key that ever signed heads, oldest first: what an old one signed stays to be checked. */
export async function headKeys(services: Pick<Services, 'read' | 'env'>): Promise<HeadKey[]> {
  const rows = await services.read
    .select()
    .from(signingKey)
    .where(eq(signingKey.use, 'tree-head'))
    .orderBy(asc(signingKey.createdAt));
  return await Promise.all(
    rows.map(async (row) => ({
      kid: row.kid,
      verifier: await verifierKey(services.env.BELLKEEP_CUSTODY_ORIGIN, publicKeyOf(row.publicJwk)),
      createdAt: row.createdAt,
      supersededAt: row.supersededAt,
      compromisedAt: row.compromisedAt,
    })),
  );
}

/** Verifier key strings of every key that is not compromised. */
export const verifierLines = async (services: Pick<Services, 'read' | 'env'>): Promise<string[]> =>
  (await headKeys(services)).filter((key) => key.compromisedAt === null).map((key) => key.verifier);
