'use client';

import Link from 'next/link';
import { usePathname } from 'next/navigation';
import { useEffect, useState } from 'react';
import { cx } from '@/components/ui/cx';
import { Dialog } from '@/components/ui/Dialog';
import { FindButton } from './CommandBox';
import { PersonLines } from './PersonLines';
import type { Presence } from './person';
import { currentRoom, roomsOf } from './rooms';
import { SignOut } from './SignOut';
import { ThemeSwitch } from './ThemeSwitch';

const BAR =
  'no-print fixed inset-x-0 bottom-0 z-5 flex border-t border-line bg-well pb-[env(safe-area-inset-bottom)]';

const entryClass = (on: boolean) =>
  cx(
    'flex min-h-[52px] min-w-0 flex-1 items-center justify-center border-t-[3px] px-1 text-center leading-tight -outline-offset-2',
    on ? 'border-brass bg-linen font-bold text-brass' : 'border-transparent text-ink',
  );

/** The rooms at the bottom, on a tablet held upright or a phone. */
export function BottomBar(props: Presence) {
  const pathname = usePathname();
  const rooms = roomsOf(props.person.roles);
  const current = currentRoom(pathname, rooms);
  const [open, setOpen] = useState(false);
  // biome-ignore lint/correctness/useExhaustiveDependencies: going to another page closes the sheet
  useEffect(() => setOpen(false), [pathname]);
  return (
    <nav aria-label="Rooms" className={cx(BAR, 'plate:hidden group-has-[[data-room-bar]]/shell:hidden')}>
      {rooms.map((room) => (
        <Link
          key={room.id}
          href={room.href}
          aria-current={room === current ? 'page' : undefined}
          className={entryClass(room === current)}
        >
          {room.name}
        </Link>
      ))}
      <button type="button" className={entryClass(false)} onClick={() => setOpen(true)}>
        More
      </button>
      <Dialog open={open} onOpenChange={setOpen} title="Bellkeep">
        <div className="grid gap-5">
          <PersonLines person={props.person} hospital={props.hospital} />
          <FindButton onOpen={() => setOpen(false)} />
          <ThemeSwitch theme={props.theme} />
          <div className="flex items-center gap-6 [&_button]:min-h-11">
            <Link href="/account" className="link min-h-11 content-center">
              Account
            </Link>
            <SignOut action={props.signOut} />
          </div>
        </div>
      </Dialog>
    </nav>
  );
}

export interface RoomBarItem {
  href: string;
  label: string;
  count?: number;
}

/** A bar of one room's own places, in place of the rooms: on a page without a plate, at any width. */
export function RoomBar({ label, items }: { label: string; items: readonly RoomBarItem[] }) {
  const pathname = usePathname();
  const current = items
    .filter(({ href }) => pathname === href || pathname.startsWith(`${href}/`))
    .sort((a, b) => b.href.length - a.href.length)[0];
  return (
    <nav aria-label={label} data-room-bar="" className={BAR}>
      {items.map((item) => (
        <Link
          key={item.href}
          href={item.href}
          aria-current={item === current ? 'page' : undefined}
          className={entryClass(item === current)}
        >
          {item.label}
          {item.count ? <>&nbsp;{item.count}</> : null}
        </Link>
      ))}
    </nav>
  );
}
