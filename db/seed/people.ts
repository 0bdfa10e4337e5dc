import { symmetricEncrypt } from 'better-auth/crypto';
import { account, personRole, personWard, twoFactor, user } from '@/db/schema';
import { appendEntries } from '@/lib/custody/append';
import { SERVICE_ACTOR } from '@/lib/custody/entry';
import { hashPassword } from '@/lib/identity/password';
import { newId, readableCode } from '@/lib/platform/ids';
import type { Services } from '@/lib/platform/services';
import { PEOPLE, type SeedPerson } from './harrowmere';

const BASE32 = 'ABCDEFGHIJKLMNOPQRSTUVWXYZ234567';

/** RFC 4648, 6, without padding. */
function base32(bytes: Uint8Array): string {
  let bits = '';
  for (const byte of bytes) bits += byte.toString(2).padStart(8, '0');
  return (bits.match(/.{1,5}/g) ?? [])
    .map((five) => BASE32[Number.parseInt(five.padEnd(5, '0'), 2)])
    .join('');
}

export interface SeededPerson extends SeedPerson {
  id: string;
  password: string;
  /** Set for those whose role needs a second factor. */
  factor: { secret: string; recoveryCodes: string[] } | null;
}

/** People with passwords of their own, made now and printed once; the IT administrator with a second factor. */
export async function seedPeople(services: Services, wardIds: Map<string, string>): Promise<SeededPerson[]> {
  const made: SeededPerson[] = [];
  for (const person of PEOPLE) {
    const now = services.clock.now();
    const id = newId();
    const password = `${readableCode(4)}-${readableCode(4)}-${readableCode(4)}`.toLowerCase();
    const hashed = await hashPassword(password);
    const needsFactor = person.roles.includes('itadmin');
    const secret = readableCode(32);
    const recoveryCodes = Array.from({ length: 8 }, () =>
      `${readableCode(5)}-${readableCode(5)}`.toLowerCase(),
    );
    const sealed = needsFactor
      ? {
          secret: await symmetricEncrypt({ key: services.env.BELLKEEP_AUTH_SECRET, data: secret }),
          backupCodes: await symmetricEncrypt({
            key: services.env.BELLKEEP_AUTH_SECRET,
            data: JSON.stringify(recoveryCodes),
          }),
        }
      : null;
    await services.write(async (tx) => {
      const stamp = new Date(now);
      await tx.insert(user).values({
        id,
        name: person.name,
        email: person.email,
        emailVerified: true,
        createdAt: stamp,
        updatedAt: stamp,
        twoFactorEnabled: needsFactor,
        jobTitle: person.jobTitle,
      });
      await tx.insert(account).values({
        id: newId(),
        accountId: id,
        providerId: 'credential',
        userId: id,
        password: hashed,
        createdAt: stamp,
        updatedAt: stamp,
      });
      for (const role of person.roles)
        await tx.insert(personRole).values({ personId: id, role, givenBy: null, givenAt: now });
      for (const ward of person.wards)
        await tx.insert(personWard).values({ personId: id, wardId: wardIds.get(ward) ?? '' });
      if (sealed) await tx.insert(twoFactor).values({ id: newId(), userId: id, verified: true, ...sealed });
      await appendEntries(tx, now, [
        {
          kind: 'person-joined',
          actor: SERVICE_ACTOR,
          subjects: [{ kind: 'person', id }],
          after: { roles: person.roles, wards: person.wards },
        },
      ]);
    });
    made.push({
      ...person,
      id,
      password,
      factor: needsFactor ? { secret: base32(new TextEncoder().encode(secret)), recoveryCodes } : null,
    });
  }
  return made;
}

/** The sign-ins as they are printed. `{origin}` is filled in when the address is known. */
export function signInsText(people: SeededPerson[]): string {
  const lines = people.map(
    (person) =>
      `  ${person.email.padEnd(30)} ${person.password}   ${person.name}, ${person.roles.join(', ')}`,
  );
  const factors = people.flatMap((person) =>
    person.factor
      ? [
          `  Second factor of ${person.name}: authenticator key ${person.factor.secret}`,
          `  or one of these recovery codes, each once: ${person.factor.recoveryCodes.join('  ')}`,
        ]
      : [],
  );
  return ['', 'Harrowmere General Hospital at {origin}', '', ...lines, '', ...factors, ''].join('\n');
}
