import { cx } from '@/components/ui/cx';
import { Time } from '@/components/ui/Time';
import { wordedEntry } from './entryWords';

export interface ThreadLine {
  sequence: number;
  at: number;
  entry: {
    kind: string;
    actor: { kind: string; label: string; role?: string };
    detail?: Record<string, unknown>;
    before?: Record<string, unknown>;
    after?: Record<string, unknown>;
  };
}

const BEADS = { plain: 'border-ink-soft', access: 'border-brass', alarm: 'border-rust' } as const;

/** A thread as beads on a vertical tube, newest on top. Each bead is an entry. */
export function CustodyThread({ lines }: { lines: readonly ThreadLine[] }) {
  return (
    <ol className="relative before:absolute before:top-2 before:bottom-2 before:left-[9px] before:w-1 before:rounded-full before:bg-line-strong">
      {lines.map((line) => {
        const { title, sentence, tone } = wordedEntry(line.entry);
        return (
          <li key={line.sequence} id={`entry-${line.sequence}`} className="relative pb-5 pl-10">
            <span
              aria-hidden="true"
              className={cx('absolute top-1 left-[3px] size-4 rounded-full border-4 bg-linen', BEADS[tone])}
            />
            <div className="flex flex-wrap items-baseline justify-between gap-x-4">
              <p>
                <b>{title}</b>{' '}
                <span className="font-mono text-13 text-ink-soft">
                  entry {line.sequence.toLocaleString('en-GB')}
                </span>
                {tone === 'alarm' ? (
                  <span className="ml-2 text-13 font-semibold text-rust">needs a look</span>
                ) : null}
              </p>
              <Time at={line.at} mode="millisecond" className="text-13 text-ink-soft" />
            </div>
            <p className="max-w-line break-words text-ink-soft">{sentence}</p>
          </li>
        );
      })}
    </ol>
  );
}
