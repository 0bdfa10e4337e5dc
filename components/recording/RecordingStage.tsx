'use client';

import { useCallback, useId, useMemo, useState } from 'react';
import type { Spectrogram, WaveformPeaks } from '@/lib/acoustics/types';
import { type DbScale, scaleOf } from './stage/drawSpectrogram';
import { SPECTROGRAM_GRADIENT } from './stage/palette';
import { StageControls } from './stage/StageControls';
import { type StageMark, StageMarks } from './stage/StageMarks';
import { StagePlot } from './stage/StagePlot';
import { STAGE_KEYS } from './stage/useStageKeys';
import { fitView, type Stretch, stretchInWords, ticksOf } from './stage/view';
import type { Playhead } from './usePlayhead';

export type { StageMark } from './stage/StageMarks';
export type { Stretch } from './stage/view';

export interface RecordingStageProps {
  /** Names it: "Recording 7K3F-92QX". */
  label: string;
  durationSeconds: number;
  /** null while they are being fetched. */
  peaks: WaveformPeaks | null;
  spectrogram: Spectrogram | null;
  /** Why there is no picture, in words. */
  problem?: string | null;
  marks?: readonly StageMark[];
  selection: Stretch | null;
  onSelect: (selection: Stretch | null) => void;
  playhead: Playhead;
  /** Colours of two recordings side by side mean the same when both get one scale. */
  scale?: DbScale;
  /** Held outside, for two stages that move together; else the stage holds it. */
  view?: Stretch;
  onView?: (view: Stretch) => void;
  /** Highest frequency at first; 2 kHz, or what there is. */
  topHz?: number;
}

/** Waveform and spectrogram on one time axis, with findings and places where they are. */
export function RecordingStage(props: RecordingStageProps) {
  const { durationSeconds, peaks, spectrogram, marks = [], selection, onSelect, playhead } = props;
  const keysId = useId();
  const [view, setView] = useStageView(props);
  const { topHz, setTopHz, topChoices } = useTop(spectrogram, props.topHz);
  const [gain, setGain] = useState(1);
  const own = useMemo(() => (spectrogram ? scaleOf(spectrogram) : null), [spectrogram]);
  const scale = props.scale ?? own;
  const showSelect = (stretch: Stretch) => {
    onSelect(stretch);
    playhead.seek(stretch.from);
    if (stretch.from < view.from || stretch.to > view.to) {
      const length = Math.max(view.to - view.from, (stretch.to - stretch.from) * 1.5);
      setView(
        fitView({ from: stretch.from - length / 4, to: stretch.from + length * 0.75 }, durationSeconds),
      );
    }
  };
  return (
    <section aria-label={props.label} className="rounded-plate border border-line bg-sheet">
      <div className="border-b border-line pr-2.5 pl-[46px]">
        <StageMarks marks={marks} view={view} onSelect={showSelect} />
      </div>
      <div className="grid grid-cols-[46px_minmax(0,1fr)] pt-1 pr-2.5">
        <LevelAxis gain={gain} topHz={topHz} />
        <StagePlot
          label={`${props.label}, waveform and spectrogram up to ${topHz} Hz`}
          {...{
            durationSeconds,
            peaks,
            spectrogram,
            scale,
            view,
            setView,
            topHz,
            gain,
            selection,
            onSelect,
            playhead,
          }}
          describedBy={keysId}
        >
          {props.problem || !peaks ? <Waiting problem={props.problem ?? null} /> : null}
        </StagePlot>
        <span />
        <TimeAxis view={view} />
      </div>
      <StageControls
        {...{ view, setView, durationSeconds, topHz, setTopHz, topChoices, gain, setGain, scale }}
        gradient={SPECTROGRAM_GRADIENT}
      />
      <p id={keysId} className="sr-only">
        {STAGE_KEYS}
      </p>
      <p role="status" className="sr-only">
        {selection ? `Selected ${stretchInWords(selection)}` : ''}
      </p>
    </section>
  );
}

function useStageView({
  view,
  onView,
  durationSeconds,
}: RecordingStageProps): [Stretch, (view: Stretch) => void] {
  const [own, setOwn] = useState<Stretch>({ from: 0, to: durationSeconds });
  const set = useCallback(
    (next: Stretch) => {
      if (onView) onView(next);
      else setOwn(next);
    },
    [onView],
  );
  return [view ?? own, set];
}

function useTop(spectrogram: Spectrogram | null, wanted = 2000) {
  const most = spectrogram ? Math.round((spectrogram.bins - 1) * spectrogram.binHz) : wanted;
  const topChoices = [...new Set([500, 1000, 2000, most])]
    .filter((choice) => choice <= most)
    .sort((a, b) => a - b);
  const [chosen, setTopHz] = useState<number | null>(null);
  return { topHz: chosen ?? Math.min(wanted, most), setTopHz, topChoices };
}

function Waiting({ problem }: { problem: string | null }) {
  return (
    <div
      role={problem ? 'alert' : 'status'}
      className="absolute inset-0 grid place-items-center bg-sheet text-ink-soft"
    >
      {problem ?? 'The picture is on its way'}
    </div>
  );
}

const label = 'absolute right-1.5 whitespace-nowrap text-13 leading-none text-ink-soft';

/** Decibels of the waveform's height, then the frequencies of the spectrogram. Drawn for eyes; the controls say it. */
function LevelAxis({ gain, topHz }: { gain: number; topHz: number }) {
  const topDb = Math.round(-20 * Math.log10(gain)) || 0;
  const dB = (value: number) => `${value}`.replace('-', '−');
  const { values } = ticksOf(0, topHz, 4);
  return (
    <div aria-hidden="true" className="relative h-[330px]">
      <span className={label} style={{ top: 0 }}>
        {dB(topDb)} dB
      </span>
      <span className={label} style={{ top: 60 - 60 * 0.501 - 6 }}>
        {dB(topDb - 6)}
      </span>
      {values.map((value) => (
        <span
          key={value}
          className={label}
          style={{ top: Math.min(316, Math.max(124, 120 + 210 * (1 - value / topHz) - 6)) }}
        >
          {value === 0 ? '0 Hz' : value >= 1000 ? `${value / 1000} k` : value}
        </span>
      ))}
    </div>
  );
}

function TimeAxis({ view }: { view: Stretch }) {
  const { values, digits } = ticksOf(view.from, view.to, 8);
  return (
    <div aria-hidden="true" className="relative h-7 overflow-hidden">
      {values.map((value, index) => {
        const share = (value - view.from) / (view.to - view.from);
        const last = index === values.length - 1;
        return (
          <span
            key={value}
            className="absolute top-1 text-13 whitespace-nowrap text-ink-soft before:absolute before:-top-1 before:left-1/2 before:h-1 before:border-l before:border-line-strong"
            style={{
              left: `${share * 100}%`,
              transform: `translateX(${share < 0.02 ? '0' : share > 0.97 ? '-100%' : '-50%'})`,
            }}
          >
            {value.toFixed(digits)}
            {last ? ' s' : ''}
          </span>
        );
      })}
    </div>
  );
}
