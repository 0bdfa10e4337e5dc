import type { Sight } from '@/db/queries/sight';
import type { Person } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';

/** What this person sees now: their wards, and patients whom a reason that still holds has opened. */
export const sightOf = (
  services: Pick<Services, 'clock'>,
  person: Pick<Person, 'id' | 'wardIds'>,
): Sight => ({ personId: person.id, wardIds: person.wardIds, nowMs: services.clock.now() });
