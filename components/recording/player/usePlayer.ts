'use client';

import { useCallback, useEffect, useRef, useState } from 'react';
import type { Stretch } from '../stage/view';
import type { Playhead } from '../usePlayhead';
import { type BandChoice, Engine, type Heard, loudest } from './engine';
import { loadSound, SoundError } from './loadSound';

export type PlayerState = 'idle' | 'loading' | 'playing' | 'failed';

export interface PlayerSettings {
  loop: boolean;
  rate: number;
  band: BandChoice;
  louder: boolean;
}

interface PlayerOptions {
  href: string;
  durationSeconds: number;
  selection: Stretch | null;
  playhead: Playhead;
  settings: PlayerSettings;
  onHeard?: (heard: Heard) => void;
}

interface Loaded {
  engine: Engine;
  louderGain: number;
}

/** Fetches the sound at the first press, never before: to fetch it is to have listened. */
export function usePlayer(options: PlayerOptions) {
  const { href, playhead } = options;
  const [state, setState] = useState<PlayerState>('idle');
  const [problem, setProblem] = useState<string | null>(null);
  const loaded = useRef<Loaded | null>(null);
  const latest = useRef(options);
  useEffect(() => {
    latest.current = options;
  });
  const getLoaded = useLoading(href, loaded);

  const stop = useCallback(() => {
    const heard = loaded.current?.engine.stop() ?? null;
    setState('idle');
    report(latest.current, heard);
  }, []);
  const play = useCallback(async () => {
    setProblem(null);
    if (!loaded.current) setState('loading');
    try {
      const { engine, louderGain } = await getLoaded();
      const { settings, ...now } = latest.current;
      const stretch = stretchToPlay(now.selection, now.playhead.get(), now.durationSeconds);
      // What was heard until now was heard in another way, or elsewhere: told apart.
      report(latest.current, engine.stop());
      await engine.play({
        ...stretch,
        ...settings,
        gain: settings.louder ? louderGain : 1,
        onEnd: (heard) => {
          setState('idle');
          report(latest.current, heard);
          now.playhead.set(stretch.from);
        },
      });
      setState('playing');
    } catch (error) {
      if (error instanceof DOMException && error.name === 'AbortError') return;
      setState('failed');
      setProblem(
        error instanceof SoundError
          ? error.message
          : 'The sound could not be played. Nothing was changed. Try again.',
      );
    }
  }, [getLoaded]);
  useFollow(state, loaded, playhead);
  useEffect(
    () => (state === 'playing' ? playhead.onSeek(() => void play()) : undefined),
    [state, playhead, play],
  );
  return { state, problem, play, stop };
}

/** The selection; else from the playhead on, or from the start where that is the end. */
function stretchToPlay(selection: Stretch | null, seconds: number, durationSeconds: number): Stretch {
  if (selection) return selection;
  return { from: seconds < durationSeconds - 0.05 ? seconds : 0, to: durationSeconds };
}

/** A press that was taken back at once is no listening. */
const SHORTEST_HEARD_SECONDS = 0.2;

function report({ onHeard }: PlayerOptions, heard: Heard | null) {
  if (heard && heard.seconds > SHORTEST_HEARD_SECONDS) onHeard?.(heard);
}

function useLoading(href: string, loaded: { current: Loaded | null }) {
  const pending = useRef<{ promise: Promise<Loaded>; stop: AbortController } | null>(null);
  useEffect(() => {
    // Keyed by the address: another recording in the same place starts afresh.
    void href;
    return () => {
      pending.current?.stop.abort();
      pending.current = null;
      loaded.current?.engine.close();
      loaded.current = null;
    };
  }, [href, loaded]);
  return useCallback((): Promise<Loaded> => {
    if (loaded.current) return Promise.resolve(loaded.current);
    if (pending.current) return pending.current.promise;
    const stop = new AbortController();
    const context = new AudioContext();
    const promise = loadSound(context, href, stop.signal).then(
      (buffer) => {
        loaded.current = { engine: new Engine(context, buffer), louderGain: loudest(buffer) };
        pending.current = null;
        return loaded.current;
      },
      (error) => {
        pending.current = null;
        void context.close();
        throw error;
      },
    );
    pending.current = { promise, stop };
    return promise;
  }, [href, loaded]);
}

function useFollow(state: PlayerState, loaded: { current: Loaded | null }, playhead: Playhead) {
  useEffect(() => {
    if (state !== 'playing') return;
    let frame = 0;
    const follow = () => {
      const position = loaded.current?.engine.position();
      if (position !== null && position !== undefined) playhead.set(position);
      frame = requestAnimationFrame(follow);
    };
    frame = requestAnimationFrame(follow);
    return () => cancelAnimationFrame(frame);
  }, [state, loaded, playhead]);
}
