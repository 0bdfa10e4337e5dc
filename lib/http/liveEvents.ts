import { entriesFrom, logSize, type ThreadEntry } from '@/lib/custody/readThread';
import { may } from '@/lib/identity/permissions';
import type { Person } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';

const POLL_MS = 700;
const BEAT_MS = 20_000;
/** A stream begins anew after this, so that a session that has ended does not go on listening. */
const LONGEST_MS = 15 * 60_000;
const AT_ONCE = 200;
const STREAMS_A_PERSON = 8;

const shared = globalThis as {
  bellkeepStreams?: { open: Set<() => void>; byPerson: Map<string, number>; listening: boolean };
};
function streams() {
  shared.bellkeepStreams ??= { open: new Set(), byPerson: new Map(), listening: false };
  const state = shared.bellkeepStreams;
  if (!state.listening) {
    state.listening = true;
    // An open stream would hold a stopping server up for as long as a browser likes.
    for (const signal of ['SIGTERM', 'SIGINT'] as const)
      process.once(signal, () => {
        for (const end of state.open) end();
      });
  }
  return state;
}

/** Which subjects of an entry this person may hear of: the names of things only, never what happened to them. */
function audible(person: Person, entry: ThreadEntry): { kind: string; id: string }[] {
  const clinical = may(person.roles, 'recording.read');
  const fleet = may(person.roles, 'device.read');
  const people = may(person.roles, 'people.read');
  return entry.entry.subjects.filter(({ kind }) => {
    if (['recording', 'patient', 'encounter', 'session'].includes(kind))
      return clinical || (kind === 'recording' && fleet);
    if (['device', 'model'].includes(kind)) return fleet;
    if (kind === 'credential' || kind === 'signing-key') return may(person.roles, 'credential.read');
    if (kind === 'person' || kind === 'invitation') return people || may(person.roles, 'ledger.read');
    return true;
  });
}

/** Entries after which a person's sessions may have ended, or may do something else. */
const CHANGES_AUTHORITY = new Set<string>([
  'role-given',
  'role-taken',
  'person-left',
  'sessions-ended',
  'password-reset',
  'second-factor-set',
  'second-factor-removed',
]);

const speaksOf = (person: Person, { entry }: ThreadEntry): boolean =>
  entry.subjects.some(({ kind, id }) => kind === 'person' && id === person.id);

/**
 * Server-sent events that follow the custody log: what changed, so that pages ask again. The log is in the database, so
 * it does not matter which process the change happened in.
 */
export async function eventStream(
  services: Services,
  person: Person,
  signal: AbortSignal,
): Promise<Response | null> {
  const state = streams();
  if ((state.byPerson.get(person.id) ?? 0) >= STREAMS_A_PERSON) return null;
  let next = await logSize(services);
  const encoder = new TextEncoder();
  let end: () => void = () => undefined;
  const body = new ReadableStream<Uint8Array>({
    start(controller) {
      state.byPerson.set(person.id, (state.byPerson.get(person.id) ?? 0) + 1);
      const say = (text: string) => controller.enqueue(encoder.encode(text));
      say('retry: 2000\n\n');
      let polling = false;
      const poll = setInterval(async () => {
        if (polling) return;
        polling = true;
        try {
          for (const entry of await entriesFrom(services, next, AT_ONCE)) {
            next = entry.sequence + 1;
            // What one may hear was read when the stream began: it begins anew, or not at all.
            if (CHANGES_AUTHORITY.has(entry.kind) && speaksOf(person, entry)) return end();
            const subjects = audible(person, entry);
            if (subjects.length > 0)
              say(
                `id: ${entry.sequence}\ndata: ${JSON.stringify({ kind: entry.kind, subjects, sequence: entry.sequence })}\n\n`,
              );
          }
        } catch (error) {
          services.log.warn({ err: error }, 'an event stream could not read the log');
        } finally {
          polling = false;
        }
      }, POLL_MS);
      const beat = setInterval(() => say(': still here\n\n'), BEAT_MS);
      const longest = setTimeout(() => end(), LONGEST_MS);
      let over = false;
      end = () => {
        if (over) return;
        over = true;
        clearInterval(poll);
        clearInterval(beat);
        clearTimeout(longest);
        state.open.delete(end);
        state.byPerson.set(person.id, Math.max(0, (state.byPerson.get(person.id) ?? 1) - 1));
        try {
          controller.close();
        } catch {
          // The other side closed it first.
        }
      };
      state.open.add(end);
      signal.addEventListener('abort', end);
    },
    cancel: () => end(),
  });
  return new Response(body, {
    headers: {
      'content-type': 'text/event-stream; charset=utf-8',
      'cache-control': 'no-store, no-transform',
      'x-accel-buffering': 'no',
    },
  });
}
