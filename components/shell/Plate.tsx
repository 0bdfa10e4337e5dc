'use client';

import Link from 'next/link';
import { usePathname } from 'next/navigation';
import { cx } from '@/components/ui/cx';
import { FindButton } from './CommandBox';
import { PersonLines } from './PersonLines';
import type { Presence } from './person';
import { currentRoom, roomsOf } from './rooms';
import { SignOut } from './SignOut';
import { ThemeSwitch } from './ThemeSwitch';

/** The plate at the left: the mark, the rooms, and who is here. */
export function Plate({ person, hospital, theme, signOut }: Presence) {
  const rooms = roomsOf(person.roles);
  const current = currentRoom(usePathname(), rooms);
  return (
    <header className="no-print sticky top-0 hidden h-dvh flex-col overflow-y-auto border-r border-line bg-well pt-6 plate:flex plate:group-has-[[data-plain-page]]/shell:hidden">
      <Link href="/" className="px-4 pb-6 font-plate text-21 leading-none font-semibold -outline-offset-2">
        Bellkeep
      </Link>
      <nav aria-label="Rooms">
        <ul className="grid gap-1">
          {rooms.map((room) => (
            <li key={room.id}>
              <Link
                href={room.href}
                aria-current={room === current ? 'page' : undefined}
                className={cx(
                  'block border-l-[3px] px-4 py-2.5 -outline-offset-2',
                  room === current
                    ? 'border-brass bg-linen font-bold text-brass'
                    : 'border-transparent text-ink hover:border-line-strong',
                )}
              >
                {room.name}
              </Link>
            </li>
          ))}
        </ul>
      </nav>
      <div className="mt-4 px-4">
        <FindButton />
      </div>
      <div className="mt-auto grid gap-3 border-t border-line px-4 pt-3 pb-4 text-13 text-ink-soft">
        <PersonLines person={person} hospital={hospital} />
        <ThemeSwitch theme={theme} />
        <div className="flex flex-wrap gap-x-4 gap-y-1">
          <Link href="/account" className="link">
            Account
          </Link>
          <SignOut action={signOut} />
        </div>
      </div>
    </header>
  );
}
