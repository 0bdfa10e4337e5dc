'use client';

import { useRouter } from 'next/navigation';
import {
  createContext,
  type ReactNode,
  useCallback,
  useContext,
  useEffect,
  useMemo,
  useRef,
  useState,
} from 'react';

/** Something changed. It names what, never how: whoever shows it asks again. */
export interface LiveEvent {
  kind: string;
  subjects: readonly { kind: string; id: string }[];
  sequence: number;
}
export type LiveStatus = 'connecting' | 'open' | 'waiting';
type Listener = (event: LiveEvent) => void;

/** Sent to everybody after the line was down: anything may have happened meanwhile. */
export const RESUMED = 'resumed';
const FIRST_RETRY_MS = 1_000;
const LONGEST_RETRY_MS = 30_000;

interface Live {
  subscribe: (listener: Listener) => () => void;
  status: LiveStatus;
}
const LiveContext = createContext<Live>({ subscribe: () => () => undefined, status: 'connecting' });

export function LiveEvents({ address = '/api/events', children }: { address?: string; children: ReactNode }) {
  const listeners = useRef(new Set<Listener>());
  const [status, setStatus] = useState<LiveStatus>('connecting');
  const subscribe = useCallback((listener: Listener) => {
    listeners.current.add(listener);
    return () => {
      listeners.current.delete(listener);
    };
  }, []);
  useEffect(() => {
    const send = (event: LiveEvent) => {
      for (const listener of listeners.current) listener(event);
    };
    return listen(address, send, setStatus);
  }, [address]);
  const live = useMemo(() => ({ subscribe, status }), [subscribe, status]);
  return <LiveContext value={live}>{children}</LiveContext>;
}

/**
 * Calls `revalidate` (an SWR `mutate`, a router refresh) soon after an event that matches. Many at once are one
 * call; after the line was down everybody is called.
 */
export function useLive(match: (event: LiveEvent) => boolean, revalidate: () => void): LiveStatus {
  const { subscribe, status } = useContext(LiveContext);
  const latest = useRef({ match, revalidate });
  useEffect(() => {
    latest.current = { match, revalidate };
  });
  useEffect(() => {
    let timer: ReturnType<typeof setTimeout> | undefined;
    const end = subscribe((event) => {
      if (timer || (event.kind !== RESUMED && !latest.current.match(event))) return;
      timer = setTimeout(() => {
        timer = undefined;
        latest.current.revalidate();
      }, 80);
    });
    return () => {
      clearTimeout(timer);
      end();
    };
  }, [subscribe]);
  return status;
}

/** Draws the server's page again when an event matches. */
export function useLiveRefresh(match: (event: LiveEvent) => boolean): LiveStatus {
  const router = useRouter();
  return useLive(match, () => router.refresh());
}

/** For server pages: draws them again when something of a kind (and id) they show has changed. */
export function LiveRefresh({ subjects }: { subjects: readonly { kind: string; id?: string }[] }) {
  useLiveRefresh((event) => subjects.some(({ kind, id }) => concerns(event, kind, id)));
  return null;
}

export const concerns = (event: LiveEvent, kind: string, id?: string): boolean =>
  event.subjects.some((subject) => subject.kind === kind && (id === undefined || subject.id === id));

/** Keeps one event stream open until the returned function is called. */
function listen(address: string, send: Listener, say: (status: LiveStatus) => void): () => void {
  let source: EventSource | undefined;
  let timer: ReturnType<typeof setTimeout> | undefined;
  let tries = 0;
  let wasOpen = false;
  const open = () => {
    source = new EventSource(address);
    source.onopen = () => {
      tries = 0;
      say('open');
      if (wasOpen) send({ kind: RESUMED, subjects: [], sequence: 0 });
      wasOpen = true;
    };
    source.onmessage = ({ data }) => {
      const event = eventOf(String(data));
      if (event) send(event);
    };
    source.onerror = () => {
      // A browser gives up for good on an HTTP error, and hammers on a broken line: we do the waiting.
      source?.close();
      say('waiting');
      const wait = Math.min(LONGEST_RETRY_MS, FIRST_RETRY_MS * 2 ** tries++);
      timer = setTimeout(open, wait * (0.75 + Math.random() / 2));
    };
  };
  open();
  return () => {
    clearTimeout(timer);
    source?.close();
  };
}

function eventOf(text: string): LiveEvent | null {
  try {
    const read: unknown = JSON.parse(text);
    if (typeof read !== 'object' || read === null) return null;
    const { kind, subjects, sequence } = read as Record<string, unknown>;
    if (typeof kind !== 'string' || !Array.isArray(subjects)) return null;
    return { kind, subjects, sequence: typeof sequence === 'number' ? sequence : 0 };
  } catch {
    return null;
  }
}
