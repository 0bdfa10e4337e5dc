import { cx } from '@/components/ui/cx';

/** Where a device stands in its service life. */
export type ServiceState = 'waiting' | 'in-service' | 'quarantined' | 'in-repair' | 'retired' | 'lost';

const STATES: Record<ServiceState, { word: string; colour: string }> = {
  waiting: { word: 'Waiting', colour: 'text-slate' },
  'in-service': { word: 'In service', colour: 'text-spruce' },
  quarantined: { word: 'Quarantined', colour: 'text-rust' },
  'in-repair': { word: 'In repair', colour: 'text-brass' },
  retired: { word: 'Retired', colour: 'text-ink-soft' },
  lost: { word: 'Lost', colour: 'text-rust' },
};

export const serviceStateWord = (state: ServiceState): string => STATES[state].word;

/** A device's state: a word and a shape of its own, so that colour never says it alone. */
export function DeviceState({ state }: { state: ServiceState }) {
  const { word, colour } = STATES[state];
  return (
    <span className={cx('inline-flex items-center gap-1.5 whitespace-nowrap', colour)}>
      <svg aria-hidden="true" viewBox="0 0 13 13" className="size-[13px] flex-none">
        <Shape state={state} />
      </svg>
      {word}
    </span>
  );
}

const LINE = { fill: 'none', stroke: 'currentColor', strokeWidth: 2 } as const;

function Shape({ state }: { state: ServiceState }) {
  switch (state) {
    case 'in-service':
      return <rect width="13" height="13" fill="currentColor" />;
    case 'quarantined':
      return <circle cx="6.5" cy="6.5" r="5.5" {...LINE} />;
    case 'in-repair':
      return (
        <>
          <rect x="1" y="1" width="11" height="11" {...LINE} />
          <rect x="1" y="6.5" width="11" height="5.5" fill="currentColor" />
        </>
      );
    case 'waiting':
      return <rect x="1" y="1" width="11" height="11" {...LINE} strokeDasharray="2 2.4" />;
    case 'retired':
      return <path d="M1 6.5h11" {...LINE} />;
    case 'lost':
      return <path d="M2 2l9 9M11 2l-9 9" {...LINE} />;
  }
}
