import { placesOf, type SubjectPlace } from '@/db/queries/places';
import { entriesFrom, logSize, type ThreadEntry } from '@/lib/custody/readThread';
import type { Services } from '@/lib/platform/services';

const POLL_MS = 700;
const AT_ONCE = 200;

/** New entries, in order, and to whom the recordings, sessions and encounters in them belong now. */
export interface Batch {
  entries: ThreadEntry[];
  placeOf(kind: string, id: string): SubjectPlace | undefined;
}
type Follower = (batch: Batch) => void;
type Reading = Pick<Services, 'read' | 'log'>;

interface Tail {
  followers: Set<Follower>;
  /** Sequence number of the first entry that was not told yet. */
  next: number;
  timer: ReturnType<typeof setTimeout> | null;
}

const shared = globalThis as { bellkeepTails?: WeakMap<object, Tail> };

/**
 * Follow the custody log from its present end. All followers of a process share one reading of it, a little more than
 * once a second; it does not matter which process an entry was written by.
 *
 * @returns a function that ends it
 */
export async function followLog(services: Reading, follower: Follower): Promise<() => void> {
  shared.bellkeepTails ??= new WeakMap();
  const tail = shared.bellkeepTails.get(services.read) ?? { followers: new Set(), next: 0, timer: null };
  shared.bellkeepTails.set(services.read, tail);
  const from = await logSize(services);
  const mine: Follower = (batch) => {
    const entries = batch.entries.filter((entry) => entry.sequence >= from);
    if (entries.length > 0) follower({ ...batch, entries });
  };
  if (tail.followers.size === 0) tail.next = from;
  tail.followers.add(mine);
  tail.timer ??= setTimeout(() => void poll(services, tail), POLL_MS);
  return () => {
    tail.followers.delete(mine);
    if (tail.followers.size > 0 || tail.timer === null) return;
    clearTimeout(tail.timer);
    tail.timer = null;
  };
}

async function poll(services: Reading, tail: Tail): Promise<void> {
  try {
    for (;;) {
      const entries = await entriesFrom(services, tail.next, AT_ONCE);
      if (entries.length === 0) break;
      const batch = await batchOf(services, entries);
      tail.next = (entries.at(-1)?.sequence ?? tail.next) + 1;
      for (const follower of tail.followers) follower(batch);
      if (entries.length < AT_ONCE) break;
    }
  } catch (error) {
    services.log.warn({ err: error }, 'the live events could not read the log');
  }
  if (tail.timer !== null) tail.timer = setTimeout(() => void poll(services, tail), POLL_MS);
}

async function batchOf(services: Reading, entries: ThreadEntry[]): Promise<Batch> {
  const subjects = entries.flatMap(({ entry }) => entry.subjects);
  const idsOf = (kind: string) => [
    ...new Set(subjects.filter((one) => one.kind === kind).map(({ id }) => id)),
  ];
  const places = await placesOf(services.read, {
    recordings: idsOf('recording'),
    sessions: idsOf('session'),
    encounters: idsOf('encounter'),
  });
  const known = new Map(places.map((place) => [`${place.kind} ${place.id}`, place]));
  return { entries, placeOf: (kind, id) => known.get(`${kind} ${id}`) };
}
