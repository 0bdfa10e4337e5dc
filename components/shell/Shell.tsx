import type { ReactNode } from 'react';
import { Clock } from '@/components/ui/Clock';
import { ToastRegion } from '@/components/ui/Toast';
import { BottomBar } from './BottomBar';
import { CommandBox } from './CommandBox';
import { LiveEvents } from './LiveEvents';
import { Plate } from './Plate';
import type { Presence } from './person';

/** `signOut` is a server action, or an address that takes a POST. */
export interface ShellProps extends Presence {
  /** The server's time when it drew this, UTC milliseconds. */
  now: number;
  /** The hospital's time zone, an IANA name. */
  zone: string;
  children: ReactNode;
}

/**
 * What stands around every room. A page that holds a PatientBar, or anything with `data-plain-page`, gets no plate and
 * no padding; one that holds a RoomBar has that at the bottom in place of the rooms.
 */
export function Shell({ person, hospital, theme, now, zone, signOut, children }: ShellProps) {
  const common = { person, hospital, theme, signOut };
  return (
    <Clock now={now} zone={zone}>
      <LiveEvents>
        <CommandBox roles={person.roles}>
          <div className="group/shell min-h-dvh plate:grid plate:grid-cols-[176px_minmax(0,1fr)] plate:has-[[data-plain-page]]:block print:block">
            <a
              href="#main"
              className="sr-only z-40 rounded-plate bg-sheet px-4 py-3 font-semibold text-spruce focus:not-sr-only focus:fixed focus:top-2 focus:left-2"
            >
              To the page
            </a>
            <Plate {...common} />
            <main
              id="main"
              tabIndex={-1}
              className="max-w-page min-w-0 px-4 pt-4 pb-24 outline-none group-has-[[data-plain-page]]/shell:max-w-none group-has-[[data-plain-page]]/shell:p-0 plate:px-8 plate:pt-6 plate:pb-12 plate:group-has-[[data-plain-page]]/shell:p-0 print:p-0"
            >
              {children}
            </main>
            <BottomBar {...common} />
          </div>
        </CommandBox>
      </LiveEvents>
      <ToastRegion />
    </Clock>
  );
}
