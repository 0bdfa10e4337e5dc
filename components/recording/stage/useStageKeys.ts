'use client';

import type { KeyboardEvent } from 'react';
import type { Playhead } from '../usePlayhead';
import { clamp, type Stretch, viewWith, zoomAbout } from './view';

interface StageKeysOptions {
  view: Stretch;
  setView: (view: Stretch) => void;
  durationSeconds: number;
  selection: Stretch | null;
  onSelect: (selection: Stretch | null) => void;
  playhead: Playhead;
}

/** Said to screen readers, and shown under the stage. */
export const STAGE_KEYS =
  'Arrow keys move, with Shift they select, + and − zoom, 0 shows all, Escape lets go of the selection.';

/** Keys of the stage: the playhead is the caret, Shift stretches the selection as in text. */
export function useStageKeys({
  view,
  setView,
  durationSeconds,
  selection,
  onSelect,
  playhead,
}: StageKeysOptions) {
  const moveTo = (seconds: number, stretching: boolean) => {
    const caret = playhead.get();
    const next = clamp(seconds, 0, durationSeconds);
    if (stretching) {
      const anchor =
        selection && selection.from === caret
          ? selection.to
          : selection?.to === caret
            ? selection.from
            : caret;
      onSelect(anchor === next ? null : { from: Math.min(anchor, next), to: Math.max(anchor, next) });
    }
    playhead.seek(next);
    setView(viewWith(view, next, durationSeconds));
  };
  return (event: KeyboardEvent) => {
    if (event.ctrlKey || event.metaKey || event.altKey) return;
    const length = view.to - view.from;
    const caret = playhead.get();
    const moves: Record<string, number> = {
      ArrowLeft: caret - length / 100,
      ArrowRight: caret + length / 100,
      PageUp: caret - length / 10,
      PageDown: caret + length / 10,
      Home: 0,
      End: durationSeconds,
    };
    const goal = moves[event.key];
    if (goal !== undefined) moveTo(goal, event.shiftKey);
    else if (event.key === '+' || event.key === '=')
      setView(zoomAbout(view, caretIn(view, caret), 0.5, durationSeconds));
    else if (event.key === '-' || event.key === '−')
      setView(zoomAbout(view, caretIn(view, caret), 2, durationSeconds));
    else if (event.key === '0') setView({ from: 0, to: durationSeconds });
    else if (event.key === 'Escape' && selection) onSelect(null);
    else return;
    event.preventDefault();
  };
}

/** Zoom keeps the caret in place while it is in sight, else the middle. */
const caretIn = (view: Stretch, caret: number) =>
  caret >= view.from && caret <= view.to ? caret : (view.from + view.to) / 2;
