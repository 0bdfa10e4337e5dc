'use client';

import { useState } from 'react';

/** Where in the recording one is, shared by stage and player without drawing the page again sixty times a second. */
export interface Playhead {
  get(): number;
  /** Follows what is playing. */
  set(seconds: number): void;
  /** A person put it there: what is playing goes on from here. */
  seek(seconds: number): void;
  subscribe(listener: (seconds: number) => void): () => void;
  onSeek(listener: (seconds: number) => void): () => void;
}

type Listeners = Set<(seconds: number) => void>;
const joining = (listeners: Listeners) => (listener: (seconds: number) => void) => {
  listeners.add(listener);
  return () => {
    listeners.delete(listener);
  };
};

export function createPlayhead(): Playhead {
  let seconds = 0;
  const listeners: Listeners = new Set();
  const seekers: Listeners = new Set();
  const set = (next: number) => {
    seconds = next;
    for (const listener of listeners) listener(next);
  };
  return {
    get: () => seconds,
    set,
    seek(next) {
      set(next);
      for (const seeker of seekers) seeker(next);
    },
    subscribe: joining(listeners),
    onSeek: joining(seekers),
  };
}

export const usePlayhead = (): Playhead => useState(createPlayhead)[0];
