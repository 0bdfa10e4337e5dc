'use client';

import { type ReactNode, useEffect, useId, useRef, useState } from 'react';
import { Button } from '@/components/ui/Button';
import { Chip } from '@/components/ui/Chip';
import { Notice } from '@/components/ui/Notice';
import type { Band, BandChoice, Heard } from './player/engine';
import { type PlayerSettings, usePlayer } from './player/usePlayer';
import { type Stretch, stretchInWords } from './stage/view';
import type { Playhead } from './usePlayhead';

export type { Heard } from './player/engine';

/** Bands like the two sides of a chestpiece: common practice, no source. */
const LOW: Band = { lowHz: 20, highHz: 200 };
const HIGH: Band = { lowHz: 100, highHz: 1000 };

export interface PlayerProps {
  /** Where the recording's bytes are: fetched at the first press. */
  href: string;
  durationSeconds: number;
  selection: Stretch | null;
  playhead: Playhead;
  /** Told after each act of listening. */
  onHeard?: (heard: Heard) => void;
  /** More chips at the end, such as "Compare". */
  children?: ReactNode;
}

/** Plays the whole or the selection, looped, slowed, or through a band. The recording itself is never changed. */
export function Player({ href, durationSeconds, selection, playhead, onHeard, children }: PlayerProps) {
  const [settings, setSettings] = useState<PlayerSettings>({
    loop: false,
    rate: 1,
    band: null,
    louder: false,
  });
  const player = usePlayer({ href, durationSeconds, selection, playhead, settings, onHeard });
  const playing = player.state === 'playing';
  const toggle = () => (playing ? player.stop() : void player.play());
  useSpaceBar(toggle);
  useReplayOn(settings, playing, player.play);
  return (
    <div className="grid gap-3">
      <div className="flex flex-wrap items-center gap-2.5">
        <Button
          variant="primary"
          busy={player.state === 'loading'}
          busyLabel="Fetching"
          onClick={toggle}
          aria-keyshortcuts="Space"
        >
          {playing ? 'Stop' : selection ? 'Play selection' : 'Play'}
        </Button>
        <Reading selection={selection} playhead={playhead} durationSeconds={durationSeconds} />
        <WaysOfListening
          settings={settings}
          change={(part) => setSettings((before) => ({ ...before, ...part }))}
        />
        {children}
      </div>
      {player.problem ? <Notice tone="alarm">{player.problem}</Notice> : null}
    </div>
  );
}

interface WaysProps {
  settings: PlayerSettings;
  change: (part: Partial<PlayerSettings>) => void;
}

function WaysOfListening({ settings, change }: WaysProps) {
  const [own, setOwn] = useState<Band | null>(null);
  const choose = (band: BandChoice, kept: Band | null) => {
    setOwn(kept);
    change({ band });
  };
  const isBand = (band: BandChoice) => own === null && sameBand(settings.band, band);
  return (
    <>
      <Chip pressed={isBand(LOW)} onClick={() => choose(LOW, null)} title="Through a band like the bell">
        Low band 20–200 Hz
      </Chip>
      <Chip
        pressed={isBand(HIGH)}
        onClick={() => choose(HIGH, null)}
        title="Through a band like the diaphragm"
      >
        High band 100–1000 Hz
      </Chip>
      <Chip pressed={isBand(null)} onClick={() => choose(null, null)} title="As recorded">
        Whole
      </Chip>
      <Chip pressed={own !== null} onClick={() => (own ? choose(null, null) : choose(FIRST_OWN, FIRST_OWN))}>
        Own band…
      </Chip>
      {own ? (
        <OwnBand band={own} onChange={(band) => (isRight(band) ? choose(band, band) : setOwn(band))} />
      ) : null}
      <Chip
        pressed={settings.rate === 0.5}
        onClick={() => change({ rate: settings.rate === 1 ? 0.5 : 1 })}
        title="Half as fast, an octave lower"
      >
        ½ speed
      </Chip>
      <Chip pressed={settings.loop} onClick={() => change({ loop: !settings.loop })}>
        Loop
      </Chip>
      <Chip
        pressed={settings.louder}
        onClick={() => change({ louder: !settings.louder })}
        title="As loud as it gets without cutting off"
      >
        Louder
      </Chip>
    </>
  );
}

const FIRST_OWN: Band = { lowHz: 60, highHz: 600 };
const isRight = (band: Band) => band.lowHz > 0 && band.highHz > band.lowHz;
const sameBand = (a: BandChoice, b: BandChoice) => a?.lowHz === b?.lowHz && a?.highHz === b?.highHz;

/** "6.10 to 8.35 s", or how far one is. */
function Reading({
  selection,
  playhead,
  durationSeconds,
}: Pick<PlayerProps, 'selection' | 'playhead' | 'durationSeconds'>) {
  const text = useRef<HTMLSpanElement>(null);
  useEffect(() => {
    const show = (seconds: number) => {
      if (text.current)
        text.current.textContent = selection
          ? stretchInWords(selection)
          : `${seconds.toFixed(2)} of ${durationSeconds.toFixed(2)} s`;
    };
    show(playhead.get());
    return playhead.subscribe(show);
  }, [selection, playhead, durationSeconds]);
  return <span ref={text} className="mono min-w-[136px] whitespace-nowrap" />;
}

interface OwnBandProps {
  band: Band;
  onChange: (band: Band) => void;
}

function OwnBand({ band, onChange }: OwnBandProps) {
  const id = useId();
  const right = isRight(band);
  const input = (key: keyof Band, name: string) => (
    <label className="flex items-center gap-2">
      {name}
      <input
        type="number"
        min={1}
        max={20_000}
        value={band[key] || ''}
        onChange={({ target }) => onChange({ ...band, [key]: Number(target.value) })}
        aria-invalid={!right || undefined}
        aria-describedby={right ? undefined : id}
        className="w-20 rounded-plate border border-line-control bg-sheet px-2 py-1"
      />
    </label>
  );
  return (
    <fieldset className="flex flex-wrap items-center gap-2 text-13">
      <legend className="sr-only">Own band</legend>
      {input('lowHz', 'from')}
      {input('highHz', 'to')} Hz
      {right ? null : (
        <span id={id} className="text-rust">
          The second must be above the first.
        </span>
      )}
    </fieldset>
  );
}

/** Space plays and stops, unless it belongs to what has focus. */
function useSpaceBar(toggle: () => void) {
  const latest = useRef(toggle);
  useEffect(() => {
    latest.current = toggle;
  });
  useEffect(() => {
    const onKeyDown = (event: KeyboardEvent) => {
      if (event.key !== ' ' || event.ctrlKey || event.metaKey || event.altKey || event.defaultPrevented)
        return;
      const target = event.target as HTMLElement;
      if (target.closest('button, a, input, select, textarea, summary, [contenteditable], [role="dialog"]'))
        return;
      event.preventDefault();
      latest.current();
    };
    document.addEventListener('keydown', onKeyDown);
    return () => document.removeEventListener('keydown', onKeyDown);
  }, []);
}

/** A change of the way of listening is heard at once. */
function useReplayOn(settings: PlayerSettings, playing: boolean, play: () => Promise<void>) {
  const before = useRef(settings);
  useEffect(() => {
    if (before.current === settings) return;
    before.current = settings;
    if (playing) void play();
  }, [settings, playing, play]);
}
