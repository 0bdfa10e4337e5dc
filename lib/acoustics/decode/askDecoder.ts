import { Unreadable } from './types';

/** The reason of a file whose decoder gave up on it. */
export const GAVE_UP = 'frames-unreadable';

/**
 * Call a packed format's decoder. One that throws on what it was given has said that it cannot read it. It also prints
 * what it says in its answer: a hostile file must not fill a log, so the console is silent for the length of the call,
 * which does not wait for anything.
 *
 * @throws Unreadable GAVE_UP; the decoder may be broken then, and is not asked again
 */
export function askDecoder<Result>(call: () => Result): Result {
  const { error } = console;
  console.error = () => undefined;
  try {
    return call();
  } catch {
    throw new Unreadable(GAVE_UP);
  } finally {
    console.error = error;
  }
}

/** A broken decoder may not even be freed; its memory then goes when nothing holds it. */
export function freeDecoder(decoder: { free(): void }): void {
  try {
    decoder.free();
  } catch {
    // Nothing is left to be done about it.
  }
}
