import { createDecoder, type DecodeResult } from '@/lib/acoustics/decode/decode';
import type { AudioFormat } from '@/lib/acoustics/types';
import { type Sample, soundCorpus } from './corpus';
import { mutated } from './mutate';
import { Random } from './random';

/** Samples over all channels that a mutated file of a few kilobytes may ask for; more is refused. */
const LIMITS = { longestSeconds: 3600, freeSamples: 2_000_000, samplesPerByte: 400 };

export interface FuzzCase {
  name: string;
  bytes: Uint8Array;
  /** Sizes of the pieces that it is pushed in. */
  pieces: number[];
}

/** Case `index` of a seed: always the same. */
export function decodeCase(corpus: readonly Sample[], seed: number, index: number): FuzzCase {
  const random = new Random((seed * 1_000_003 + index * 7919) >>> 0);
  const { name, bytes } = random.of(corpus);
  const changed = mutated(bytes, random.of(corpus).bytes, random);
  const pieces = random.chance(3)
    ? [Math.max(1, changed.length)]
    : Array.from({ length: 1 + random.int(5) }, () => 1 + random.int(random.of([3, 100, 5000])));
  return { name, bytes: changed, pieces };
}

/**
 * Decode one case and hold the result against what always is so.
 *
 * @throws Error where something is not so, or whatever the decoder threw
 */
export async function tryDecodeCase({ bytes, pieces }: FuzzCase): Promise<DecodeResult> {
  let format: AudioFormat | null = null;
  let frames = 0;
  let formats = 0;
  const decoder = createDecoder({
    limits: LIMITS,
    onFormat(found) {
      format = found;
      formats++;
    },
    onBlock(block) {
      hold(format !== null, 'a block before the format');
      hold(block.length === format?.channels, 'a block of other channels');
      for (const channel of block) {
        hold(channel.length === block[0]?.length && channel.length > 0, 'channels of different length');
        hold(channel.every(Number.isFinite), 'a sample that is no number');
      }
      frames += block[0]?.length ?? 0;
    },
  });
  for (let at = 0, i = 0; at < bytes.length; i++) {
    const size = pieces[i % pieces.length] ?? 1;
    await decoder.push(bytes.subarray(at, at + size));
    at += size;
  }
  const result = await decoder.end();
  hold(formats <= 1, 'the format twice');
  hold(result.ok === (result.failure === null), 'ok and failure disagree');
  hold(result.ok === (result.reason === ''), 'ok and reason disagree');
  hold(result.frames === frames, 'frames are not what came in blocks');
  hold(!result.ok || (frames > 0 && result.format !== null), 'all is well without a sample');
  hold(result.missingFrames >= 0 && Number.isFinite(result.missingFrames), 'missing frames are senseless');
  const { channels = 1, sampleRateHz = 8000 } = result.format ?? {};
  hold(
    channels >= 1 && channels <= 8 && sampleRateHz >= 500 && sampleRateHz <= 192_000,
    'a format out of range',
  );
  // One block of a packed format may go over the limit before it is noticed.
  const most = Math.max(LIMITS.freeSamples, bytes.length * LIMITS.samplesPerByte) + 8 * 65_536;
  hold(frames * channels <= most, 'more samples than the limits allow');
  return result;
}

function hold(condition: boolean, otherwise: string): void {
  if (!condition) throw new Error(otherwise);
}

export interface FuzzReport {
  cases: number;
  /** How often a file ended in which way. */
  outcomes: Record<string, number>;
  failures: { index: number; name: string; message: string }[];
}

/**
 * Decode mutated files until `more` says no.
 *
 * @param before told of each case before it begins: what a watchdog needs to name the one that hangs
 */
export async function fuzzDecode(
  seed: number,
  more: (cases: number) => boolean,
  before: (index: number, name: string) => void = () => undefined,
  first = 0,
): Promise<FuzzReport> {
  const corpus = soundCorpus();
  const report: FuzzReport = { cases: 0, outcomes: {}, failures: [] };
  for (let index = first; more(index - first); index++) {
    const one = decodeCase(corpus, seed, index);
    before(index, one.name);
    try {
      const { ok, reason } = await tryDecodeCase(one);
      const outcome = ok ? 'decoded' : reason;
      report.outcomes[outcome] = (report.outcomes[outcome] ?? 0) + 1;
    } catch (error) {
      report.failures.push({
        index,
        name: one.name,
        message: error instanceof Error ? `${error.stack}` : String(error),
      });
    }
    report.cases++;
  }
  return report;
}
