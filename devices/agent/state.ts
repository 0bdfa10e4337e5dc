import type { JWK } from 'jose';
import { z } from 'zod';
import { CredentialAnswer } from '@/lib/contract/device';
import type { Disk } from './disk';

const FILE = 'device.json';

/** What a device keeps between two power cuts: one file, so that key and credential never part. */
const State = z.object({
  serialNumber: z.string(),
  /** The service that gave the credential; elsewhere the credential is worth nothing. */
  origin: z.string().optional(),
  privateJwk: z.looseObject({ kty: z.string(), crv: z.string(), x: z.string(), d: z.string() }),
  credential: CredentialAnswer.nullable(),
  /** The credential before: kept until the new one was used once. */
  previous: CredentialAnswer.nullable(),
});
export type State = Omit<z.infer<typeof State>, 'privateJwk'> & { privateJwk: JWK };

/** The state folder holds something that is not a device's state, or another device's. */
export class StateUnreadable extends Error {}

/** @returns null when the device never woke before. @throws StateUnreadable */
export async function readState(disk: Disk): Promise<State | null> {
  const bytes = await disk.read(FILE);
  if (bytes === null) return null;
  try {
    return State.parse(JSON.parse(new TextDecoder().decode(bytes)));
  } catch (cause) {
    // The key in it may be the only one there is: it is never overwritten on a guess.
    throw new StateUnreadable(`${FILE} cannot be read. Move it away and enrol the device again.`, { cause });
  }
}

export const writeState = (disk: Disk, state: State): Promise<void> =>
  disk.write(FILE, JSON.stringify(state));
