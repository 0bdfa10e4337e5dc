'use client';

import { type PointerEvent, useRef } from 'react';
import type { Playhead } from '../usePlayhead';
import { clamp, type Stretch } from './view';

/** Nearer than this to an edge of the selection, a drag moves that edge. */
const EDGE_PIXELS = 8;
/** A press that moves less is a click. */
const CLICK_PIXELS = 3;

interface PointerSelectionOptions {
  view: Stretch;
  durationSeconds: number;
  selection: Stretch | null;
  onSelect: (selection: Stretch | null) => void;
  playhead: Playhead;
}

/** Drag selects, dragging an edge moves it, a click puts the playhead there and lets go of the selection. */
export function usePointerSelection(options: PointerSelectionOptions) {
  const drag = useRef<{ anchor: number; x: number; moved: boolean } | null>(null);
  const { view, durationSeconds, selection, onSelect, playhead } = options;
  const secondsAt = (event: PointerEvent<HTMLElement>) => {
    const box = event.currentTarget.getBoundingClientRect();
    const share = (event.clientX - box.left) / box.width;
    return clamp(view.from + share * (view.to - view.from), 0, durationSeconds);
  };
  const onPointerDown = (event: PointerEvent<HTMLElement>) => {
    if (event.button !== 0) return;
    const seconds = secondsAt(event);
    const edge = (EDGE_PIXELS * (view.to - view.from)) / event.currentTarget.getBoundingClientRect().width;
    let anchor = seconds;
    if (selection && Math.abs(seconds - selection.from) < edge) anchor = selection.to;
    else if (selection && Math.abs(seconds - selection.to) < edge) anchor = selection.from;
    event.currentTarget.setPointerCapture(event.pointerId);
    drag.current = { anchor, x: event.clientX, moved: false };
  };
  const onPointerMove = (event: PointerEvent<HTMLElement>) => {
    const held = drag.current;
    if (!held) return;
    if (!held.moved && Math.abs(event.clientX - held.x) < CLICK_PIXELS) return;
    held.moved = true;
    const seconds = secondsAt(event);
    onSelect({ from: Math.min(held.anchor, seconds), to: Math.max(held.anchor, seconds) });
  };
  const onPointerUp = (event: PointerEvent<HTMLElement>) => {
    const held = drag.current;
    drag.current = null;
    if (!held) return;
    if (held.moved) {
      playhead.seek(Math.min(held.anchor, secondsAt(event)));
    } else {
      playhead.seek(secondsAt(event));
      onSelect(null);
    }
  };
  const onPointerCancel = () => {
    drag.current = null;
  };
  return { onPointerDown, onPointerMove, onPointerUp, onPointerCancel };
}
