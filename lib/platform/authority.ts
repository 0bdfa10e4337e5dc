import type { Actor } from '@/lib/custody/entry';
import { PERMISSIONS, type Permission, type Role } from '@/lib/identity/permissions';

/** Somebody who is signed in, as read from the session at this request. */
export interface Person {
  id: string;
  name: string;
  email: string;
  jobTitle: string | null;
  roles: readonly Role[];
  wardIds: readonly string[];
  sessionId: string;
}

declare const granted: unique symbol;

/**
 * A person for whom a permission was checked in this request. Verbs take this and not a bare Person, so that a
 * route which forgets to check does not compile. Made by `lib/http` alone.
 */
export type Authorized<P extends Permission> = Person & { readonly [granted]: P };

/** The person as actor of a custody entry, in the role that let them do it. */
export function personActor<P extends Permission>(person: Authorized<P>, permission: P): Actor {
  const role = person.roles.find((held) => (PERMISSIONS[permission] as readonly Role[]).includes(held));
  return { kind: 'person', id: person.id, label: person.name, ...(role ? { role } : {}) };
}
