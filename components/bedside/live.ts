import { concerns, type LiveEvent } from '@/components/shell/LiveEvents';

/** Looking and listening change nothing that a list shows. */
const ACCESS = new Set(['looked-at', 'heard', 'downloaded', 'copied', 'exported']);

/** Whether an event changed something of one of these kinds, or one of these things. */
export const changed = (event: LiveEvent, ...things: (string | { kind: string; id: string })[]): boolean =>
  !ACCESS.has(event.kind) &&
  things.some((thing) =>
    typeof thing === 'string' ? concerns(event, thing) : concerns(event, thing.kind, thing.id),
  );
