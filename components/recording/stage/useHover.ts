'use client';

import { type PointerEvent, useRef } from 'react';
import type { Stretch } from './view';

/** Height of the waveform above the spectrogram, and of that, in CSS pixels. */
export const WAVE_PIXELS = 120;
export const SPECTROGRAM_PIXELS = 210;

/** Writes where the pointer is, in seconds and over the spectrogram in Hz, into an element; nothing for touch. */
export function useHover(view: Stretch, topHz: number) {
  const text = useRef<HTMLSpanElement>(null);
  const onPointerOver = (event: PointerEvent<HTMLElement>) => {
    if (!text.current || event.pointerType === 'touch') return;
    const box = event.currentTarget.getBoundingClientRect();
    const seconds = view.from + ((event.clientX - box.left) / box.width) * (view.to - view.from);
    const depth = event.clientY - box.top - WAVE_PIXELS;
    const hertz = depth < 0 ? '' : ` · ${Math.round(topHz * Math.max(0, 1 - depth / SPECTROGRAM_PIXELS))} Hz`;
    text.current.textContent = `${seconds.toFixed(2)} s${hertz}`;
  };
  const onPointerLeave = () => {
    if (text.current) text.current.textContent = '';
  };
  return { text, onPointerOver, onPointerLeave };
}
