'use client';

import { cx } from '@/components/ui/cx';
import type { DbScale } from './drawSpectrogram';
import { fitView, type Stretch, stretchInWords, zoomAbout } from './view';

interface StageControlsProps {
  view: Stretch;
  setView: (view: Stretch) => void;
  durationSeconds: number;
  topHz: number;
  topChoices: readonly number[];
  setTopHz: (topHz: number) => void;
  gain: number;
  setGain: (gain: number) => void;
  scale: DbScale | null;
  /** Colours of the scale as a CSS gradient, quiet to loud. */
  gradient: string;
}

const GAINS = [1, 2, 4, 8, 16] as const;
const hertz = (value: number) => (value >= 1000 ? `${value / 1000} kHz` : `${value} Hz`);
const dB = (value: number) => `${Math.round(value)}`.replace('-', '−');

/** The line under the time axis: zoom and move, how high, how tall, and what the colours stand for. */
export function StageControls(props: StageControlsProps) {
  const { topHz, topChoices, setTopHz, gain, setGain, scale, gradient } = props;
  return (
    <div className="no-print flex flex-wrap items-center gap-x-5 gap-y-1 border-t border-line px-2.5 py-1 text-13 text-ink-soft">
      <Zoom {...props} />
      <Choice
        label="up to"
        value={topHz}
        onChange={setTopHz}
        options={topChoices.map((choice) => [choice, hertz(choice)])}
      />
      <Choice
        label="waveform"
        value={gain}
        onChange={setGain}
        options={GAINS.map((choice) => [choice, choice === 1 ? 'true height' : `${choice} times taller`])}
      />
      {scale ? (
        <span className="ml-auto flex items-center gap-1.5 whitespace-nowrap">
          {dB(scale.lowDb)}
          <span
            aria-hidden="true"
            className="h-2.5 w-16 forced-color-adjust-none"
            style={{ background: gradient }}
          />
          {dB(scale.highDb)} dBFS (sine)
        </span>
      ) : null}
    </div>
  );
}

function Zoom({
  view,
  setView,
  durationSeconds,
}: Pick<StageControlsProps, 'view' | 'setView' | 'durationSeconds'>) {
  const middle = (view.from + view.to) / 2;
  const length = view.to - view.from;
  const whole = length >= durationSeconds - 1e-9;
  const zoom = (factor: number) => setView(zoomAbout(view, middle, factor, durationSeconds));
  return (
    <>
      <fieldset className="flex items-center">
        <legend className="sr-only">Zoom</legend>
        <Small label="Zoom out" onClick={() => zoom(2)} disabled={whole}>
          −
        </Small>
        <Small label="Zoom in" onClick={() => zoom(0.5)}>
          +
        </Small>
        <Small onClick={() => setView({ from: 0, to: durationSeconds })} disabled={whole}>
          Whole
        </Small>
      </fieldset>
      {whole ? null : (
        <input
          type="range"
          aria-label="Part in view"
          aria-valuetext={stretchInWords(view)}
          min={0}
          max={durationSeconds - length}
          step="any"
          value={view.from}
          onChange={({ target }) => {
            const from = Number(target.value);
            setView(fitView({ from, to: from + length }, durationSeconds));
          }}
          className="min-w-24 flex-1"
        />
      )}
    </>
  );
}

interface ChoiceProps {
  label: string;
  value: number;
  onChange: (value: number) => void;
  options: readonly (readonly [number, string])[];
}

function Choice({ label, value, onChange, options }: ChoiceProps) {
  return (
    <label className="flex items-center gap-1.5">
      {label}
      <select
        value={value}
        onChange={({ target }) => onChange(Number(target.value))}
        className="min-h-7 bg-sheet text-ink"
      >
        {options.map(([choice, words]) => (
          <option key={choice} value={choice}>
            {words}
          </option>
        ))}
      </select>
    </label>
  );
}

interface SmallProps {
  label?: string;
  disabled?: boolean;
  onClick: () => void;
  children: string;
}

function Small({ label, disabled, onClick, children }: SmallProps) {
  return (
    <button
      type="button"
      aria-label={label}
      disabled={disabled}
      onClick={onClick}
      className={cx(
        'min-h-8 min-w-8 rounded-plate px-2 font-semibold',
        disabled ? 'opacity-50' : 'text-spruce hover:bg-spruce-wash',
      )}
    >
      {children}
    </button>
  );
}
