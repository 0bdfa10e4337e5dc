import type { Role } from '@/lib/identity/permissions';
import type { SignOutAction } from './SignOut';
import type { Theme } from './theme';

export interface ShellPerson {
  name: string;
  jobTitle: string | null;
  roles: readonly Role[];
}

/** Who is here and where: what the plate and the bottom bar show. */
export interface Presence {
  person: ShellPerson;
  hospital: string;
  theme: Theme;
  signOut: SignOutAction;
}
