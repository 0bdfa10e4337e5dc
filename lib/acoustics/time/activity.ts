import { type Biquad, passFilter } from '../dsp/biquad';
import { FloatList, percentile } from '../dsp/percentile';
import type { Span } from '../types';
import { rmsToDbfsSine } from './levels';

const BLOCK_SECONDS = 0.1;
const FRAME_SECONDS = 0.01;
const QUIETEST_DBFS = -120;
/** Share of handling is counted in blocks of this. */
const SHARE_SECONDS = 0.25;
const LONGEST_BURST_SECONDS = 1;
const SHORTEST_BURST_SECONDS = 0.02;

export interface ActivityMeasures {
  noiseFloorDbfsSine: number | null;
  activityRangeDb: number | null;
  handling: Span[];
  handlingShare: number;
}

/** RMS a block of a filtered stream. */
class Envelope {
  readonly values = new FloatList();
  #sum = 0;
  #n = 0;
  constructor(private readonly block: number) {}

  push(samples: Float32Array, length: number): void {
    for (let at = 0; at < length; ) {
      const end = Math.min(length, at + this.block - this.#n);
      let sum = 0;
      for (let i = at; i < end; i++) sum += (samples[i] as number) * (samples[i] as number);
      this.#sum += sum;
      this.#n += end - at;
      at = end;
      if (this.#n === this.block) {
        this.values.push(Math.sqrt(this.#sum / this.#n));
        this.#sum = 0;
        this.#n = 0;
      }
    }
  }
}

/**
 * Noise floor, activity range and handling, on the stream divided to about 5 kHz.
 *
 * Floor and range: 10th percentile, and 90th less 10th, of 100 ms RMS of the 100-1000 Hz band. Steady breathing
 * without pauses has range 0 by construction: it is an activity range, not a signal-to-noise ratio.
 *
 * Handling and contact: the envelope below 40 Hz above 10 times its median for 20 ms to 1 s, begun by a rise of more
 * than 15 dB of the 20-400 Hz band. Heart sounds do the same at every beat, so where the low band is periodic the
 * burst must also stand well above the beats. Cough and speech look the same; a device that filters out the low band
 * shows nothing here. Limits ours, tried on synthetic sounds.
 */
export class ActivityProbe {
  readonly #band: Envelope;
  readonly #low: Envelope;
  readonly #broad: Envelope;
  readonly #filters: Record<'band' | 'low' | 'broad', Biquad[]>;
  #buffer = new Float32Array(0);

  constructor(rateHz: number) {
    this.#band = new Envelope(Math.max(1, Math.round(rateHz * BLOCK_SECONDS)));
    const frame = Math.max(1, Math.round(rateHz * FRAME_SECONDS));
    this.#low = new Envelope(frame);
    this.#broad = new Envelope(frame);
    const high = (hz: number) => passFilter('high', hz, rateHz);
    const low = (hz: number) => passFilter('low', hz, rateHz);
    this.#filters = {
      band: [high(100), high(100), ...(rateHz > 2200 ? [low(1000)] : [])],
      low: [high(5), low(40), low(40)],
      broad: [high(20), low(400)],
    };
  }

  push(samples: Float32Array): void {
    const n = samples.length;
    if (this.#buffer.length < n) this.#buffer = new Float32Array(n);
    for (const [name, envelope] of [
      ['band', this.#band],
      ['low', this.#low],
      ['broad', this.#broad],
    ] as const) {
      let input = samples;
      for (const filter of this.#filters[name]) {
        filter.run(input, this.#buffer, n);
        input = this.#buffer;
      }
      envelope.push(this.#buffer, n);
    }
  }

  finish(durationSeconds: number): ActivityMeasures {
    // The filters ring at the start: their first block says nothing of the room.
    const blocks = this.#band.values.view().subarray(this.#band.values.length > 10 ? 1 : 0);
    const inDb = (fraction: number) => {
      const rms = percentile(blocks, fraction);
      return rms > 0 ? Math.max(QUIETEST_DBFS, rmsToDbfsSine(rms)) : QUIETEST_DBFS;
    };
    const handling = this.#bursts();
    return {
      noiseFloorDbfsSine: blocks.length > 0 ? inDb(0.1) : null,
      activityRangeDb: blocks.length > 0 ? inDb(0.9) - inDb(0.1) : null,
      handling,
      handlingShare: shareOf(handling, durationSeconds),
    };
  }

  #bursts(): Span[] {
    const low = this.#low.values.view();
    const broad = this.#broad.values.view();
    // A clip of a few beats does not tell a burst from a beat.
    if (low.length * FRAME_SECONDS < 5) return [];
    const median = percentile(low, 0.5);
    const threshold = Math.max(10 * median, isPeriodic(low) ? 2.5 * percentile(low, 0.97) : 0, 0.002);
    const bursts: Span[] = [];
    for (let i = 3; i < low.length; i++) {
      if ((low[i] as number) < threshold) continue;
      const before = Math.max(
        1e-5,
        Math.min(broad[i - 3] as number, broad[i - 2] as number, broad[i - 1] as number),
      );
      const rise = Math.max(broad[i] as number, broad[Math.min(i + 1, low.length - 1)] as number);
      if (rise < before * 10 ** (15 / 20)) {
        while (i < low.length && (low[i] as number) >= threshold) i++;
        continue;
      }
      const start = i;
      while (i < low.length && (low[i] as number) >= threshold) i++;
      const seconds = (i - start) * FRAME_SECONDS;
      if (seconds >= SHORTEST_BURST_SECONDS && seconds <= LONGEST_BURST_SECONDS)
        bursts.push({ startSeconds: start * FRAME_SECONDS, durationSeconds: seconds });
    }
    return bursts;
  }
}

/** Whether an envelope of 10 ms frames repeats itself at a heart's pace (0.3 to 1.5 s). */
function isPeriodic(envelope: Float32Array): boolean {
  const n = Math.min(envelope.length, 6000);
  if (n < 400) return false;
  let mean = 0;
  for (let i = 0; i < n; i++) mean += envelope[i] as number;
  mean /= n;
  let power = 0;
  for (let i = 0; i < n; i++) power += ((envelope[i] as number) - mean) ** 2;
  if (power === 0) return false;
  for (let lag = 30; lag <= 150; lag++) {
    let sum = 0;
    for (let i = 0; i + lag < n; i++)
      sum += ((envelope[i] as number) - mean) * ((envelope[i + lag] as number) - mean);
    if ((sum / (n - lag)) * n > 0.45 * power) return true;
  }
  return false;
}

function shareOf(spans: Span[], durationSeconds: number): number {
  const blocks = Math.max(1, Math.ceil(durationSeconds / SHARE_SECONDS));
  const touched = new Set<number>();
  for (const span of spans) {
    for (
      let b = Math.floor(span.startSeconds / SHARE_SECONDS);
      b <= Math.floor((span.startSeconds + span.durationSeconds) / SHARE_SECONDS);
      b++
    )
      touched.add(b);
  }
  return touched.size / blocks;
}
