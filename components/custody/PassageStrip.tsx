'use client';

import { type ReactNode, useEffect, useRef, useState } from 'react';
import { cx } from '@/components/ui/cx';
import { Time } from '@/components/ui/Time';

export const STAGES = ['awaited', 'received', 'sealed', 'measured', 'filed'] as const;
export type Stage = (typeof STAGES)[number];
type Segment = 'done' | 'now' | 'cut' | 'open';

/**
 * The five segments of a passage. What was reached is done and the step after it is under way, except that a measured
 * clip waits for a person, and that a stopped passage is cut where it should have gone on.
 *
 * @param stage the last stage reached; null before there is a clip
 */
export function segmentsOf(stage: Stage | null, stopped = false): Segment[] {
  if (stage === null) return STAGES.map(() => 'open');
  const reached = STAGES.indexOf(stage);
  // Awaiting is itself the work of its stage: that segment is only done when the bytes are here.
  const next = stage === 'awaited' ? 0 : reached + 1;
  return STAGES.map((_, index) => {
    if (index < next) return 'done';
    if (index > next) return 'open';
    if (stopped) return 'cut';
    return stage === 'measured' ? 'open' : 'now';
  });
}

const VERDICTS = { usable: 'usable', care: 'use with care', repeat: 'record again' } as const;

/** The passage in words: "Sealed, being measured", "Stopped after received", "Filed, usable". */
export function passageInWords(
  stage: Stage | null,
  stopped = false,
  verdict?: keyof typeof VERDICTS | null,
): string {
  if (stage === null) return 'No clip yet';
  const said = verdict ? `, ${VERDICTS[verdict]}` : '';
  if (stopped) return `Stopped after ${stage}${said}`;
  const words: Record<Stage, string> = {
    awaited: 'Awaited',
    received: 'Received, being sealed',
    sealed: 'Sealed, being measured',
    measured: 'Measured, not filed yet',
    filed: 'Filed',
  };
  return `${words[stage]}${said}`;
}

export interface PassageStripProps {
  /** The last stage reached; null before there is a clip. */
  stage: Stage | null;
  /** It will not go on by itself. */
  stopped?: boolean;
  verdict?: keyof typeof VERDICTS | null;
}

/** The passage of one recording, 72 by 8 px: stands wherever a recording is named. */
export function PassageStrip({ stage, stopped, verdict }: PassageStripProps) {
  const words = `Passage: ${passageInWords(stage, stopped, verdict)}`;
  return (
    <span role="img" aria-label={words} title={words} className="passage">
      <Segments stage={stage} stopped={stopped} />
    </span>
  );
}

export interface PassageStep {
  /** UTC milliseconds when the stage was reached; null when not yet. */
  at: number | null;
  /** More about it: the hash, the verdict, a link to the thread. */
  detail?: ReactNode;
}

/** The same, full width, with the time of each stage; on the recording's own page. */
export function PassageStripFull({
  stage,
  stopped,
  verdict,
  steps,
}: PassageStripProps & { steps: Partial<Record<Stage, PassageStep>> }) {
  return (
    <div>
      <span
        role="img"
        aria-label={`Passage: ${passageInWords(stage, stopped, verdict)}`}
        className="passage passage-full"
      >
        <Segments stage={stage} stopped={stopped} />
      </span>
      <ol className="mt-1.5 grid gap-0.5 text-13 min-[641px]:grid-cols-5">
        {STAGES.map((name) => (
          <li key={name} className="min-w-0 pr-2 max-[640px]:flex max-[640px]:flex-wrap max-[640px]:gap-x-2">
            <b className="block max-[640px]:w-20">{name}</b>
            {steps[name]?.at == null ? (
              <span className="text-ink-soft">not yet</span>
            ) : (
              <Time at={steps[name].at} mode="clock-second" />
            )}{' '}
            {steps[name]?.detail}
          </li>
        ))}
      </ol>
    </div>
  );
}

function Segments({ stage, stopped }: Pick<PassageStripProps, 'stage' | 'stopped'>) {
  const changed = useChanged(stage);
  const segments = segmentsOf(stage, stopped);
  return STAGES.map((name, index) => (
    <i key={name} className={cx(segments[index], changed && name === stage && 'animate-pulse-once')} />
  ));
}

/** True for a moment after the value has changed, never at first sight. */
function useChanged(value: unknown): boolean {
  const before = useRef(value);
  const [changed, setChanged] = useState(false);
  useEffect(() => {
    if (before.current === value) return;
    before.current = value;
    setChanged(true);
    const timer = setTimeout(() => setChanged(false), 200);
    return () => clearTimeout(timer);
  }, [value]);
  return changed;
}
