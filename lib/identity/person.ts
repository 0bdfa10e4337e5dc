import type { Permission, Role } from './permissions';

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
