'use client';

import { useRef } from 'react';
import { cx } from '@/components/ui/cx';
import { useSize } from './useSurface';
import { lanesOf, type Stretch, stretchInWords } from './view';

/** Something at a place in the recording: a finding, or a place to listen. */
export interface StageMark {
  id: string;
  /** "clipped", "tone 412 Hz, 0.34 s". */
  label: string;
  from: number;
  to: number;
  kind: 'note' | 'care' | 'repeat' | 'place';
}

const KINDS: Record<StageMark['kind'], string> = {
  note: 'border-ink-soft bg-well text-ink-soft',
  care: 'border-brass bg-brass-wash text-brass',
  repeat: 'border-rust bg-rust-wash text-rust',
  place: 'border-slate bg-slate-wash text-slate',
};
const BARS: Record<StageMark['kind'], string> = {
  note: 'bg-ink-soft',
  care: 'bg-brass',
  repeat: 'bg-rust',
  place: 'bg-slate',
};
const LANES = 3;
const LANE_PIXELS = 28;

interface StageMarksProps {
  marks: readonly StageMark[];
  view: Stretch;
  onSelect: (selection: Stretch) => void;
}

/** The row above the waveform: each mark a button that selects its stretch, and a bar as long as it lasts. */
export function StageMarks({ marks, view, onSelect }: StageMarksProps) {
  const row = useRef<HTMLDivElement>(null);
  const { width } = useSize(row);
  const place = (seconds: number) => ((seconds - view.from) / (view.to - view.from)) * width;
  const seen = marks
    .filter((mark) => mark.to >= view.from && mark.from <= view.to)
    .sort((a, b) => a.from - b.from);
  const boxes = seen.map((mark) => {
    const boxWidth = Math.round(mark.label.length * 6.3 + 14);
    return { left: Math.max(0, Math.min(width - boxWidth, place(mark.from))), width: boxWidth };
  });
  const lanes = lanesOf(boxes, LANES);
  const used = Math.max(1, ...lanes.map((lane) => (lane ?? 0) + 1));
  return (
    <div ref={row} className="relative" style={{ height: used * LANE_PIXELS + 12 }}>
      {width === 0
        ? null
        : seen.map((mark, index) => {
            const lane = lanes[index];
            const select = () => onSelect({ from: mark.from, to: Math.max(mark.to, mark.from + 0.02) });
            const words = `${mark.label}, ${stretchInWords(mark)}`;
            const start = Math.max(0, place(mark.from));
            return (
              <div key={mark.id}>
                {lane === null || lane === undefined ? null : (
                  <button
                    type="button"
                    title={words}
                    aria-label={words}
                    onClick={select}
                    className={cx(
                      'absolute h-6 truncate rounded-[3px] border px-1.5 text-left text-13 leading-none',
                      KINDS[mark.kind],
                    )}
                    style={{
                      left: boxes[index]?.left,
                      top: 5 + lane * LANE_PIXELS,
                      width: boxes[index]?.width,
                    }}
                  >
                    {mark.label}
                  </button>
                )}
                <span
                  aria-hidden="true"
                  className={cx('absolute bottom-0 h-[3px]', BARS[mark.kind])}
                  style={{ left: start, width: Math.max(3, Math.min(width, place(mark.to)) - start) }}
                />
              </div>
            );
          })}
    </div>
  );
}
