import type { ThreadEntry } from '@/lib/custody/readThread';
import type { Person } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';
import { audibleTo } from './audible';
import { type Batch, followLog } from './logTail';

const BEAT_MS = 20_000;
/** A stream begins anew after this, so that a session that has ended does not go on listening. */
const LONGEST_MS = 15 * 60_000;
export const STREAMS_A_PERSON = 8;

const shared = globalThis as {
  bellkeepStreams?: { open: Set<() => void>; byPerson: Map<string, number>; listening: boolean };
};
function streams() {
  shared.bellkeepStreams ??= { open: new Set(), byPerson: new Map(), listening: false };
  const state = shared.bellkeepStreams;
  if (!state.listening) {
    state.listening = true;
    // An open stream would hold a stopping server up for as long as a browser likes.
    for (const signal of ['SIGTERM', 'SIGINT'] as const) process.once(signal, endStreams);
  }
  return state;
}

/** End every stream of this process: it is about to stop. */
export function endStreams(): void {
  for (const end of [...(shared.bellkeepStreams?.open ?? [])]) end();
}

/** Entries after which a person's sessions may have ended, or may do something else. */
const CHANGES_AUTHORITY = new Set<string>([
  'role-given',
  'role-taken',
  'wards-changed',
  'person-left',
  'sessions-ended',
  'password-reset',
  'second-factor-set',
  'second-factor-removed',
]);

const speaksOf = (person: Person, { entry }: ThreadEntry): boolean =>
  entry.subjects.some(({ kind, id }) => kind === 'person' && id === person.id);

/** Events that a browser has not taken: a line that is this far behind is ended, and opened anew. */
const MOST_WAITING = 1_000;

class EventStream {
  readonly body: ReadableStream<Uint8Array>;
  #controller: ReadableStreamDefaultController<Uint8Array> | null = null;
  #over = false;
  #atEnd: (() => void)[] = [];
  // Told one after the other: what takes longer to look up must not be overtaken.
  #telling: Promise<void> = Promise.resolve();
  readonly #audible: ReturnType<typeof audibleTo>;

  constructor(
    private readonly services: Services,
    private readonly person: Person,
  ) {
    this.#audible = audibleTo(services, person);
    this.body = new ReadableStream<Uint8Array>(
      {
        start: (controller) => {
          this.#controller = controller;
        },
        cancel: () => this.end(),
      },
      new CountQueuingStrategy({ highWaterMark: MOST_WAITING }),
    );
    this.say('retry: 2000\n\n');
    const beat = setInterval(() => this.say(': still here\n\n'), BEAT_MS);
    const longest = setTimeout(() => this.end(), LONGEST_MS);
    this.whenOver(() => {
      clearInterval(beat);
      clearTimeout(longest);
    });
  }

  whenOver(act: () => void): void {
    if (this.#over) act();
    else this.#atEnd.push(act);
  }

  readonly follow = (batch: Batch): void => {
    this.#telling = this.#telling
      .then(() => this.#tell(batch))
      .catch((error: unknown) => {
        // What could not be told is not known to the page: it opens another stream, and asks for everything.
        this.services.log.warn({ err: error }, 'an event stream was ended by a fault');
        this.end();
      });
  };

  readonly end = (): void => {
    if (this.#over) return;
    this.#over = true;
    for (const act of this.#atEnd) act();
    try {
      this.#controller?.close();
    } catch {
      // The other side closed it first.
    }
  };

  async #tell(batch: Batch): Promise<void> {
    for (const entry of batch.entries) {
      if (this.#over) return;
      // What one may hear was read when the stream began: it begins anew, or not at all.
      if (CHANGES_AUTHORITY.has(entry.kind) && speaksOf(this.person, entry)) return this.end();
      const subjects = await this.#audible(entry, batch);
      if (subjects.length === 0) continue;
      const data = JSON.stringify({ kind: entry.kind, subjects, sequence: entry.sequence });
      this.say(`id: ${entry.sequence}\ndata: ${data}\n\n`);
    }
  }

  private say(text: string): void {
    if (this.#over) return;
    if ((this.#controller?.desiredSize ?? 0) <= 0) this.end();
    else this.#controller?.enqueue(encoder.encode(text));
  }
}

const encoder = new TextEncoder();

/**
 * Server-sent events (HTML, 9.2) that follow the custody log: what changed, so that pages ask again. Ends when the
 * person's authority changes, when the process stops, and after a quarter of an hour: the page then opens another.
 *
 * @returns null when the person has as many streams open as one may
 */
export async function eventStream(
  services: Services,
  person: Person,
  signal: AbortSignal,
): Promise<Response | null> {
  const state = streams();
  const count = (change: 1 | -1) => {
    const now = (state.byPerson.get(person.id) ?? 0) + change;
    if (now > 0) state.byPerson.set(person.id, now);
    else state.byPerson.delete(person.id);
  };
  if ((state.byPerson.get(person.id) ?? 0) >= STREAMS_A_PERSON) return null;
  count(1);
  const stream = new EventStream(services, person);
  state.open.add(stream.end);
  stream.whenOver(() => {
    state.open.delete(stream.end);
    count(-1);
  });
  signal.addEventListener('abort', stream.end);
  try {
    stream.whenOver(await followLog(services, stream.follow));
  } catch (error) {
    stream.end();
    throw error;
  }
  if (signal.aborted) stream.end();
  return new Response(stream.body, {
    headers: {
      'content-type': 'text/event-stream; charset=utf-8',
      'cache-control': 'no-store, no-transform',
      'x-accel-buffering': 'no',
    },
  });
}
