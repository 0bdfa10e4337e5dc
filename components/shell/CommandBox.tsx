'use client';

import { Command } from 'cmdk';
import { useRouter } from 'next/navigation';
import { Dialog } from 'radix-ui';
import { createContext, type ReactNode, useContext, useEffect, useState, useSyncExternalStore } from 'react';
import { Button } from '@/components/ui/Button';
import type { Role } from '@/lib/identity/permissions';
import { roomsOf } from './rooms';
import { type SearchResult, type SearchState, useSearch } from './useSearch';

const OpenContext = createContext<() => void>(() => undefined);

/** Ctrl K or ⌘ K: to a device by asset tag, a recording by number, a patient by record number, or a room. */
export function CommandBox({ roles, children }: { roles: readonly Role[]; children: ReactNode }) {
  const [open, setOpen] = useState(false);
  useEffect(() => {
    const onKeyDown = (event: KeyboardEvent) => {
      if (
        event.key.toLowerCase() !== 'k' ||
        !(event.ctrlKey || event.metaKey) ||
        event.altKey ||
        event.shiftKey
      )
        return;
      event.preventDefault();
      setOpen((before) => !before);
    };
    document.addEventListener('keydown', onKeyDown);
    return () => document.removeEventListener('keydown', onKeyDown);
  }, []);
  return (
    <OpenContext value={() => setOpen(true)}>
      {children}
      <Dialog.Root open={open} onOpenChange={setOpen}>
        <Dialog.Portal>
          <Dialog.Overlay className="fixed inset-0 z-20 bg-veil" />
          <Dialog.Content
            aria-describedby={undefined}
            className="fixed top-[12dvh] left-1/2 z-30 w-[calc(100vw-32px)] max-w-[600px] -translate-x-1/2 overflow-hidden rounded-plate border border-line bg-sheet shadow-raised"
          >
            <Dialog.Title className="sr-only">Find</Dialog.Title>
            <Finder roles={roles} close={() => setOpen(false)} />
          </Dialog.Content>
        </Dialog.Portal>
      </Dialog.Root>
    </OpenContext>
  );
}

function Finder({ roles, close }: { roles: readonly Role[]; close: () => void }) {
  const router = useRouter();
  const [query, setQuery] = useState('');
  const [attempt, setAttempt] = useState(0);
  const found = useSearch(query, attempt);
  const go = (href: string) => {
    close();
    router.push(href);
  };
  const wanted = query.trim().toLowerCase();
  const rooms = roomsOf(roles).filter((room) => room.name.toLowerCase().includes(wanted));
  const results = 'results' in found ? found.results.filter((one) => one.kind !== 'room') : [];
  return (
    <Command label="Find" shouldFilter={false} loop>
      <Command.Input
        value={query}
        onValueChange={setQuery}
        placeholder="Asset tag, recording, record number or room"
        className="w-full border-b border-line bg-transparent px-5 py-4 text-17 -outline-offset-2"
      />
      <Command.List className="max-h-[min(420px,60dvh)] overflow-y-auto p-2">
        {results.map((result) => (
          <Item
            key={result.href}
            href={result.href}
            go={go}
            label={result.label}
            detail={detailOf(result)}
            mono={isNumber(result)}
          />
        ))}
        {rooms.map((room) => (
          <Item key={room.href} href={room.href} go={go} label={room.name} detail="room" />
        ))}
      </Command.List>
      <State
        found={found}
        shown={results.length + rooms.length}
        query={query}
        retry={() => setAttempt(attempt + 1)}
      />
    </Command>
  );
}

interface ItemProps {
  href: string;
  go: (href: string) => void;
  label: string;
  detail: string;
  mono?: boolean;
}

function Item({ href, go, label, detail, mono }: ItemProps) {
  return (
    <Command.Item
      value={href}
      onSelect={() => go(href)}
      className="flex min-h-10 cursor-pointer items-baseline gap-4 rounded-plate px-3 py-2 data-[selected=true]:bg-spruce-wash"
    >
      <span className={mono ? 'mono font-semibold' : 'font-semibold'}>{label}</span>
      <span className="min-w-0 flex-1 truncate text-right text-13 text-ink-soft">{detail}</span>
    </Command.Item>
  );
}

const isNumber = ({ kind }: SearchResult) => kind === 'device' || kind === 'recording';
const KINDS: Record<SearchResult['kind'], string> = {
  device: 'device',
  recording: 'recording',
  patient: 'patient',
  encounter: 'encounter',
  room: 'room',
};
const detailOf = ({ kind, detail }: SearchResult) => (detail ? `${KINDS[kind]} · ${detail}` : KINDS[kind]);

interface StateProps {
  found: SearchState;
  shown: number;
  query: string;
  retry: () => void;
}

function State({ found, shown, query, retry }: StateProps) {
  if (found.state === 'failed')
    return (
      <div
        role="alert"
        className="flex items-center justify-between gap-3 border-t border-line px-5 py-3 text-13 text-rust"
      >
        Search does not answer.
        <Button size="small" onClick={retry}>
          Try again
        </Button>
      </div>
    );
  const words =
    found.state === 'looking'
      ? 'Looking'
      : found.state === 'found' && shown === 0
        ? `Nothing that you may see answers to “${query.trim()}”.`
        : found.state === 'idle'
          ? 'Two characters or more. Arrow keys choose, Enter opens.'
          : `${shown} found`;
  return (
    <p role="status" className="border-t border-line px-5 py-3 text-13 text-ink-soft">
      {words}
    </p>
  );
}

const never = () => () => undefined;

/** Opens the box, for those who do not know the keys. */
export function FindButton({ onOpen }: { onOpen?: () => void }) {
  const open = useContext(OpenContext);
  const apple = useSyncExternalStore(
    never,
    () => /Mac|iPhone|iPad/.test(navigator.userAgent),
    () => false,
  );
  return (
    <button
      type="button"
      aria-keyshortcuts="Control+K Meta+K"
      onClick={() => {
        onOpen?.();
        open();
      }}
      className="flex min-h-9 w-full items-center justify-between gap-2 rounded-plate border border-line-control px-2.5 text-13 text-ink-soft hover:text-ink"
    >
      Find
      <kbd className="text-13 pointer-coarse:hidden">{apple ? '⌘ K' : 'Ctrl K'}</kbd>
    </button>
  );
}
