import { availableParallelism } from 'node:os';
import { join } from 'node:path';
import { pathToFileURL } from 'node:url';
import { Worker } from 'node:worker_threads';
import type { AnalysisRequest, AnalysisResult, FromWorker, ToWorker } from './messages';

export interface AnalysisPool {
  /**
   * Analyse one clip in a thread of its own while its bytes arrive.
   *
   * @param bytes the clip, in order; read to its end whatever happens to the thread
   * @returns null when the thread died or hung on it: the clip cannot be made sense of
   */
  analyse(bytes: AsyncIterable<Uint8Array>, request: AnalysisRequest): Promise<AnalysisResult | null>;
  /** Threads it may have, those at work, and clips that wait for one. */
  figures(): { size: number; busy: number; waiting: number };
  close(): Promise<void>;
}

/** A clip above this takes long enough that others must not wait behind it: it never gets the last thread. */
const LONG_CLIP_BYTES = 8 << 20;
/** Chunks under way to a thread: bounds memory when a thread is slower than storage. */
const CHUNKS_UNDER_WAY = 16;
/** A thread that says nothing for this long hangs. */
const SILENCE_MS = 60_000;

interface Thread {
  worker: Worker;
  ready: Promise<void>;
  busy: boolean;
}

function startWorker(): Worker {
  // Under the framework the thread's code is bundled; elsewhere it is read as TypeScript.
  const worker = process.env.NEXT_RUNTIME
    ? new Worker(new URL('./worker.ts', import.meta.url))
    : new Worker(
        pathToFileURL(join(/* turbopackIgnore: true */ process.cwd(), 'lib/ingest/workerStart.mjs')),
      );
  worker.unref();
  return worker;
}

/** Resolves when the thread's code runs. A thread that cannot even start is our fault, not the clip's. */
function whenReady(worker: Worker): Promise<void> {
  return new Promise((resolve, reject) => {
    worker.once('message', () => resolve());
    worker.once('error', (cause) => reject(new Error('the analysing thread did not start', { cause })));
    worker.once('exit', (code) =>
      reject(new Error(`the analysing thread ended with ${code} before it began`)),
    );
  });
}

/** @param options.size threads; two at least, so that a long clip leaves one for the others */
export function createAnalysisPool(
  options: { size?: number; onFailure?: (why: string) => void } = {},
): AnalysisPool {
  const size = options.size ?? Math.max(2, availableParallelism());
  const threads: Thread[] = [];
  const waiting: { long: boolean; resolve: (thread: Thread) => void }[] = [];
  let longRunning = 0;

  const freeThread = (): Thread | null => {
    const idle = threads.find((thread) => !thread.busy);
    if (idle) return idle;
    if (threads.length >= size) return null;
    const worker = startWorker();
    const ready = whenReady(worker);
    // Asked for by whoever uses the thread; until then it must not count as unheard.
    ready.catch(() => undefined);
    const thread = { worker, ready, busy: false };
    threads.push(thread);
    return thread;
  };

  function hand(): void {
    for (let i = 0; i < waiting.length; ) {
      const next = waiting[i];
      if (!next || (next.long && longRunning >= size - 1)) {
        i++;
        continue;
      }
      const thread = freeThread();
      if (!thread) return;
      waiting.splice(i, 1);
      thread.busy = true;
      if (next.long) longRunning++;
      next.resolve(thread);
    }
  }

  const take = (long: boolean) =>
    new Promise<Thread>((resolve) => {
      waiting.push({ long, resolve });
      hand();
    });

  function give(thread: Thread, long: boolean, broken: boolean): void {
    if (long) longRunning--;
    thread.busy = false;
    if (broken) {
      threads.splice(threads.indexOf(thread), 1);
      void thread.worker.terminate();
    }
    hand();
  }

  return {
    async analyse(bytes, request) {
      const long = request.totalBytes > LONG_CLIP_BYTES;
      const thread = await take(long);
      let broken = true;
      try {
        await thread.ready;
        const result = await converse(thread.worker, bytes, request, options.onFailure);
        broken = result === 'broken';
        return result === 'broken' ? null : result;
      } finally {
        give(thread, long, broken);
      }
    },
    figures: () => ({
      size,
      busy: threads.filter((thread) => thread.busy).length,
      waiting: waiting.length,
    }),
    async close() {
      await Promise.all(threads.map((thread) => thread.worker.terminate()));
      threads.length = 0;
    },
  };
}

async function converse(
  worker: Worker,
  bytes: AsyncIterable<Uint8Array>,
  request: AnalysisRequest,
  onFailure: ((why: string) => void) | undefined,
): Promise<AnalysisResult | null | 'broken'> {
  let underWay = 0;
  let roomFor: (() => void) | null = null;
  let over: AnalysisResult | null | 'broken' | undefined;
  let settle: (outcome: AnalysisResult | null | 'broken') => void = () => undefined;
  const outcome = new Promise<AnalysisResult | null | 'broken'>((resolve) => {
    settle = (value) => {
      over = value;
      roomFor?.();
      resolve(value);
    };
  });
  const onSilence = () => onDeath(new Error('the thread said nothing for a minute'));
  let silence = setTimeout(onSilence, SILENCE_MS);
  const stillThere = () => {
    clearTimeout(silence);
    silence = setTimeout(onSilence, SILENCE_MS);
  };
  const onMessage = (message: FromWorker) => {
    stillThere();
    if (message.type === 'taken') {
      underWay--;
      roomFor?.();
    } else if (message.type === 'result') settle(message.result);
    else if (message.type === 'failed') {
      onFailure?.(message.message);
      settle(null);
    }
  };
  const onDeath = (why?: unknown) => {
    if (over === undefined) onFailure?.(why instanceof Error ? why.message : 'the thread ended');
    settle('broken');
  };
  worker.on('message', onMessage).on('error', onDeath).on('exit', onDeath);
  const say = (message: ToWorker, transfer: ArrayBuffer[] = []) => worker.postMessage(message, transfer);
  try {
    say({ type: 'start', request });
    for await (const chunk of bytes) {
      if (over !== undefined) continue; // the hash still wants the rest
      if (underWay >= CHUNKS_UNDER_WAY)
        await new Promise<void>((resolve) => {
          roomFor = resolve;
        });
      // A copy of its own: what storage hands out may share its buffer with other answers.
      const own = new Uint8Array(chunk);
      underWay++;
      stillThere();
      say({ type: 'chunk', bytes: own }, [own.buffer]);
    }
    if (over === undefined) say({ type: 'end' });
    return await outcome;
  } catch (error) {
    // Storage failed half way: the thread holds half a clip and is not used again.
    settle('broken');
    await worker.terminate();
    throw error;
  } finally {
    clearTimeout(silence);
    worker.off('message', onMessage).off('error', onDeath).off('exit', onDeath);
  }
}
