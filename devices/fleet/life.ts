import { type Files, systemFiles } from '../agent/files';

/** The power went. Nothing of this life does anything any more; what is on the disk is all there is. */
export class PowerLost extends Error {}

/**
 * One life of a device, from switching on to the loss of power. Every touch of disk, network and clock is a step; at
 * the step that is the last one the power goes, before it or, for a write, in the midst of it.
 */
export interface Life {
  readonly files: Files;
  readonly fetch: typeof fetch;
  readonly sleep: (milliseconds: number) => Promise<void>;
  /** Lose the power after so many steps more. */
  dieAfter(steps: number): void;
}

export function beginLife(
  send: typeof fetch,
  rest: (milliseconds: number) => Promise<void>,
  files: Files = systemFiles,
): Life {
  let left = Number.POSITIVE_INFINITY;
  const step = () => {
    if (left <= 0) throw new PowerLost('no power');
    left--;
    if (left <= 0) throw new PowerLost('the power went');
  };
  const around =
    <A extends unknown[], R>(work: (...args: A) => Promise<R>) =>
    async (...args: A): Promise<R> => {
      step();
      const result = await work(...args);
      step();
      return result;
    };
  return {
    files: {
      makeFolder: around(files.makeFolder),
      async create(path) {
        step();
        const file = await files.create(path);
        return {
          async write(bytes) {
            if (left === 1) await file.write(bytes.subarray(0, bytes.length >> 1));
            step();
            await file.write(bytes);
          },
          sync: around(() => file.sync()),
          // A dead process closes its files too.
          close: () => file.close(),
        };
      },
      rename: around(files.rename),
      syncFolder: around(files.syncFolder),
      remove: around(files.remove),
      read: around(files.read),
      list: around(files.list),
    },
    fetch: around((input, init) => send(input, init)) as typeof fetch,
    sleep: around(rest),
    dieAfter(steps) {
      left = steps;
    },
  };
}
