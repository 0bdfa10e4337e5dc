'use client';

import { type ReactNode, type RefObject, useCallback, useEffect, useMemo, useRef } from 'react';
import type { Spectrogram, WaveformPeaks } from '@/lib/acoustics/types';
import type { Playhead } from '../usePlayhead';
import { type DbScale, drawSpectrogram } from './drawSpectrogram';
import { drawWaveform, type Surface } from './drawWaveform';
import { paletteOf } from './palette';
import { useHover } from './useHover';
import { usePointerSelection } from './usePointerSelection';
import { useStageKeys } from './useStageKeys';
import { useSurface } from './useSurface';
import { useWheel } from './useWheel';
import { type Stretch, stretchInWords } from './view';

export interface StagePlotProps {
  label: string;
  durationSeconds: number;
  peaks: WaveformPeaks | null;
  spectrogram: Spectrogram | null;
  scale: DbScale | null;
  view: Stretch;
  setView: (view: Stretch) => void;
  topHz: number;
  gain: number;
  selection: Stretch | null;
  onSelect: (selection: Stretch | null) => void;
  playhead: Playhead;
  describedBy: string;
  /** Shown over the plot while there is no picture. */
  children?: ReactNode;
}

/** Waveform above spectrogram on one time axis. A slider to the keyboard: its value is the playhead. */
export function StagePlot(props: StagePlotProps) {
  const { view, setView, durationSeconds, selection, onSelect, playhead, peaks, gain } = props;
  const plot = useRef<HTMLDivElement>(null);
  const wave = useRef<HTMLCanvasElement>(null);
  const spec = useRef<HTMLCanvasElement>(null);
  const drawWave = useCallback(
    (surface: Surface) => {
      if (peaks) drawWaveform(surface, peaks, view, gain, getComputedStyle(surface.context.canvas).color);
    },
    [peaks, view, gain],
  );
  useSurface(wave, peaks ? drawWave : null);
  useSurface(spec, useSpectrogramDrawing(props));
  useWheel(plot, view, setView, durationSeconds);
  const pointer = usePointerSelection({ view, durationSeconds, selection, onSelect, playhead });
  const onKeyDown = useStageKeys({ view, setView, durationSeconds, selection, onSelect, playhead });
  const hover = useHover(view, props.topHz);
  const line = usePlayheadLine({ plot, view, setView, playhead, durationSeconds, selection });
  return (
    <div
      ref={plot}
      role="slider"
      tabIndex={0}
      aria-label={props.label}
      aria-describedby={props.describedBy}
      aria-valuemin={0}
      aria-valuemax={durationSeconds}
      aria-valuenow={0}
      onKeyDown={onKeyDown}
      {...pointer}
      onPointerMove={(event) => {
        hover.onPointerOver(event);
        pointer.onPointerMove(event);
      }}
      onPointerLeave={hover.onPointerLeave}
      className="relative cursor-crosshair touch-pan-y overflow-hidden -outline-offset-2 select-none"
    >
      <SelectionBand view={view} selection={selection} />
      <span aria-hidden="true" className="absolute inset-x-0 top-[60px] border-t border-line" />
      <canvas ref={wave} className="relative block h-[120px] w-full text-ink" />
      <canvas ref={spec} className="relative block h-[210px] w-full bg-[#00204c]" />
      <SelectionFrame view={view} selection={selection} />
      <span
        ref={line}
        aria-hidden="true"
        className="pointer-events-none absolute inset-y-0 left-0 w-0.5 bg-brass shadow-[0_0_0_1px_var(--color-sheet)]"
      />
      <span
        ref={hover.text}
        aria-hidden="true"
        className="pointer-events-none absolute top-0 right-0 bg-sheet px-1.5 text-13 text-ink-soft empty:hidden"
      />
      {props.children}
    </div>
  );
}

function useSpectrogramDrawing({ spectrogram, scale, view, topHz }: StagePlotProps) {
  const palette = useMemo(
    () => (spectrogram && scale ? paletteOf(spectrogram, scale) : null),
    [spectrogram, scale],
  );
  return useMemo(
    () =>
      spectrogram && palette
        ? (surface: Surface) => drawSpectrogram(surface, spectrogram, view, topHz, palette)
        : null,
    [spectrogram, palette, view, topHz],
  );
}

const percent = (seconds: number, view: Stretch) =>
  `${((seconds - view.from) / (view.to - view.from)) * 100}%`;
const spanOf = (selection: Stretch, view: Stretch) => ({
  left: percent(selection.from, view),
  width: `${((selection.to - selection.from) / (view.to - view.from)) * 100}%`,
});

function SelectionBand({ view, selection }: { view: Stretch; selection: Stretch | null }) {
  if (!selection) return null;
  return (
    <span
      aria-hidden="true"
      className="absolute top-0 h-[120px] bg-slate-wash"
      style={spanOf(selection, view)}
    />
  );
}

/** White with a dark edge: seen on every colour of the spectrogram, by day and by night. */
function SelectionFrame({ view, selection }: { view: Stretch; selection: Stretch | null }) {
  if (!selection) return null;
  return (
    <span
      aria-hidden="true"
      className="pointer-events-none absolute top-[120px] h-[210px] border-[1.5px] border-dashed border-[#fff]"
      style={spanOf(selection, view)}
    />
  );
}

interface PlayheadLineOptions {
  plot: RefObject<HTMLElement | null>;
  view: Stretch;
  setView: (view: Stretch) => void;
  playhead: Playhead;
  durationSeconds: number;
  selection: Stretch | null;
}

/** Moves the line and the slider's value by hand: sixty times a second is too often to draw the page. */
function usePlayheadLine({ plot, view, setView, playhead, durationSeconds, selection }: PlayheadLineOptions) {
  const line = useRef<HTMLSpanElement>(null);
  useEffect(() => {
    const place = (seconds: number) => {
      const element = plot.current;
      if (!element || !line.current) return;
      const share = (seconds - view.from) / (view.to - view.from);
      line.current.style.left = `${share * 100}%`;
      line.current.style.visibility = share < 0 || share > 1 ? 'hidden' : 'visible';
      element.setAttribute('aria-valuenow', seconds.toFixed(2));
      const chosen = selection ? `, selected ${stretchInWords(selection)}` : '';
      element.setAttribute(
        'aria-valuetext',
        `${seconds.toFixed(2)} of ${durationSeconds.toFixed(2)} s${chosen}`,
      );
    };
    place(playhead.get());
    return playhead.subscribe((seconds) => {
      place(seconds);
      // Playing on beyond what is in view turns the page.
      const length = view.to - view.from;
      if (seconds > view.to && seconds < durationSeconds)
        setView({ from: seconds, to: Math.min(durationSeconds, seconds + length) });
    });
  }, [plot, view, setView, playhead, durationSeconds, selection]);
  return line;
}
