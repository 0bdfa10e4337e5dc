import { highPass, lowPass, PASS_ALL, TwinChains } from '../dsp/biquad';
import { percentile } from '../dsp/percentile';
import type { Kernels } from '../kernels/types';
import type { Span } from '../types';
import { Envelope } from './envelope';

const FRAME_SECONDS = 0.01;
/** A clip of a few beats does not tell a burst from a beat. */
const SHORTEST_CLIP_SECONDS = 5;
const SHORTEST_BURST_SECONDS = 0.02;
const LONGEST_BURST_SECONDS = 3;
/** Below this RMS nothing was touched. */
const LEAST_RMS = 0.002;
const OVER_MEDIAN = 10;
const LEAST_RISE = 10 ** (15 / 20);
const RISE_FRAMES = 12;
/** Holds a beat down to 50 a minute. */
const BEAT_WINDOW_SECONDS = 1.2;
/** So many windows may be without a beat; the others may be handled and the beat is still known. */
const BEAT_QUANTILE = 0.15;
const OVER_BEAT = 2.5;
/** With a crack of the band above the heart to go with it, less will do. */
const OVER_BEAT_WITH_CRACK = 1.4;
const CRACK_RISE = 10 ** (8 / 20);
const CRACK_FRAMES = 20;
/** A crack against the low band: heart sounds reach 0.3. */
const LEAST_CRACK = 0.4;
/** The low band against 20-400 Hz: breath that leaks into it stays below 0.1. */
const LEAST_LOW_SHARE = 0.2;
/** A heart sound lasts up to 0.15 s, and most of it lies above 40 Hz. */
const LONGER_THAN_A_BEAT_SECONDS = 0.25;
const DEEP_SHARE = 0.6;
/** A click rings this long in the low band. */
const CLICK_SECONDS = 0.06;
/** A burst that stays this long below half its threshold is over. */
const GAP_FRAMES = 5;
/** Share of handling is counted in blocks of this. */
const SHARE_SECONDS = 0.25;

export interface HandlingMeasures {
  handling: Span[];
  /** Share of 250 ms blocks touched by it, 0 to 1. */
  handlingShare: number;
}

/**
 * Handling and contact, on the stream divided to about 5 kHz: the envelope below 40 Hz above 10 times its median for
 * 20 ms or more, begun by a rise of more than 15 dB within 120 ms. Heart sounds do the same at every beat, so a burst
 * must also stand well above the beats: above 2.5 times the lowest sixth of the largest values in each 1.2 s, or 1.4
 * times where the band above the heart (200-1000 Hz) cracks at the same moment. Cough and speech look the same; a
 * device that filters out the low band shows nothing here; knocks as regular as a beat are not told from one. Limits
 * ours, tried on synthetic sounds.
 */
export class HandlingProbe {
  readonly #envelopes: Record<'low' | 'broad' | 'high', Envelope>;
  readonly #frameSeconds: number;
  readonly #highFrameSeconds: number;
  readonly #lowAndBroad: TwinChains;
  readonly #low: Float32Array;
  readonly #broad: Float32Array;

  /** @param most samples that a push will bring */
  constructor(kernels: Kernels, deepHz: number, eventsHz: number, most: { deep: number; events: number }) {
    const frame = (rateHz: number) => Math.max(1, Math.round(rateHz * FRAME_SECONDS));
    const envelope = (rateHz: number, mostSamples: number) =>
      new Envelope(kernels, frame(rateHz), mostSamples);
    this.#envelopes = {
      low: envelope(deepHz, most.deep),
      broad: envelope(deepHz, most.deep),
      high: envelope(eventsHz, most.events),
    };
    this.#frameSeconds = frame(deepHz) / deepHz;
    this.#highFrameSeconds = frame(eventsHz) / eventsHz;
    this.#lowAndBroad = new TwinChains(kernels, [
      [highPass(5, deepHz), lowPass(40, deepHz), lowPass(40, deepHz)],
      [highPass(20, deepHz), PASS_ALL, PASS_ALL],
    ]);
    this.#low = kernels.arena.floats(most.deep);
    this.#broad = kernels.arena.floats(most.deep);
  }

  /** @param deep the stream at `deepHz`, in the kernels' arena */
  pushDeep(deep: Float32Array): void {
    const low = this.#low.subarray(0, deep.length);
    const broad = this.#broad.subarray(0, deep.length);
    this.#lowAndBroad.run(deep, low, broad);
    this.#envelopes.low.push(low);
    this.#envelopes.broad.push(broad);
  }

  /** @param high the stream at `eventsHz` without what lies below 150 Hz, in the kernels' arena */
  pushHigh(high: Float32Array): void {
    this.#envelopes.high.push(high);
  }

  /** @param holes the edges of these, and of @param clicks, ring in the low band without any contact */
  finish(durationSeconds: number, holes: readonly Span[], clicks: readonly Span[]): HandlingMeasures {
    const handling = this.#bursts().filter(
      (burst) =>
        !holes.some((hole) => touches(burst, hole)) &&
        !(burst.durationSeconds <= CLICK_SECONDS && clicks.some((click) => touches(burst, click))),
    );
    return { handling, handlingShare: shareOf(handling, durationSeconds) };
  }

  #bursts(): Span[] {
    const low = this.#envelopes.low.values.view();
    const frameSeconds = this.#frameSeconds;
    if (low.length * frameSeconds < SHORTEST_CLIP_SECONDS) return [];
    const beat = beatLevel(low, frameSeconds);
    const least = Math.max(OVER_MEDIAN * percentile(low, 0.5), LEAST_RMS);
    const found = this.#candidates(Math.max(least, OVER_BEAT_WITH_CRACK * beat)).filter(
      ({ start, end }) => risesAt(low, start) && this.#isContact(start, end, beat),
    );
    // Rubbing that goes on and on hides the beats that it should be held against; it is longer and deeper than one.
    const long = this.#candidates(least).filter(
      ({ start, end }) =>
        (end - start) * frameSeconds >= LONGER_THAN_A_BEAT_SECONDS && this.#isDeep(start, end),
    );
    return merged([...found, ...long]).map(({ start, end }) => ({
      startSeconds: start * frameSeconds,
      durationSeconds: (end - start) * frameSeconds,
    }));
  }

  /** Stretches of the low band above a threshold, in frames. */
  #candidates(threshold: number): Frames[] {
    const low = this.#envelopes.low.values.view();
    const bursts: Frames[] = [];
    for (let i = RISE_FRAMES; i < low.length; i++) {
      if ((low[i] as number) < threshold) continue;
      const start = i;
      let end = i;
      for (; i < low.length && i - end < GAP_FRAMES; i++)
        if ((low[i] as number) >= threshold / 2) end = i + 1;
      const seconds = (end - start) * this.#frameSeconds;
      if (seconds >= SHORTEST_BURST_SECONDS && seconds <= LONGEST_BURST_SECONDS) bursts.push({ start, end });
    }
    return bursts;
  }

  #isContact(start: number, end: number, beat: number): boolean {
    const { low, broad, high } = this.#envelopes;
    const loudest = largestOf(low.values.view().subarray(start, end));
    const breath = largestOf(broad.values.view().subarray(start, end));
    if (loudest < LEAST_LOW_SHARE * breath) return false;
    if (loudest >= OVER_BEAT * beat) return true;
    const ratio = this.#frameSeconds / this.#highFrameSeconds;
    const from = Math.floor(start * ratio);
    const crack = largestOf(high.values.view().subarray(from, Math.ceil(end * ratio)));
    const before = high.values.view().subarray(Math.max(0, from - CRACK_FRAMES), from);
    return crack >= LEAST_CRACK * loudest && crack >= CRACK_RISE * percentile(before, 0.5);
  }

  /** Whether most of what lies between 20 and 290 Hz is matched by what lies below 40. */
  #isDeep(start: number, end: number): boolean {
    const { low, broad } = this.#envelopes;
    const middle = (envelope: Envelope) => percentile(envelope.values.view().subarray(start, end), 0.5);
    return middle(low) >= DEEP_SHARE * middle(broad);
  }
}

interface Frames {
  start: number;
  end: number;
}

/** In order, those that overlap made one. */
function merged(bursts: Frames[]): Frames[] {
  const out: Frames[] = [];
  for (const burst of bursts.sort((a, b) => a.start - b.start)) {
    const last = out.at(-1);
    if (last && burst.start <= last.end) last.end = Math.max(last.end, burst.end);
    else out.push({ ...burst });
  }
  return out;
}

const largestOf = (values: Float32Array): number => {
  let largest = 0;
  for (const value of values) if (value > largest) largest = value;
  return largest;
};

const touches = (burst: Span, place: Span): boolean =>
  burst.startSeconds < place.startSeconds + place.durationSeconds + 0.1 &&
  burst.startSeconds + burst.durationSeconds > place.startSeconds - 0.05;

/** What the loudest of a beat reaches in this band: a low quantile over windows that hold a beat each. */
function beatLevel(envelope: Float32Array, frameSeconds: number): number {
  const window = Math.round(BEAT_WINDOW_SECONDS / frameSeconds);
  const largest = new Float32Array(Math.floor(envelope.length / window));
  for (let w = 0; w < largest.length; w++)
    for (let i = w * window; i < (w + 1) * window; i++)
      largest[w] = Math.max(largest[w] as number, envelope[i] as number);
  return percentile(largest, BEAT_QUANTILE);
}

function risesAt(envelope: Float32Array, at: number): boolean {
  let before = Number.POSITIVE_INFINITY;
  for (let back = 1; back <= RISE_FRAMES; back++) before = Math.min(before, envelope[at - back] as number);
  const peak = Math.max(envelope[at] as number, envelope[Math.min(at + 1, envelope.length - 1)] as number);
  return peak >= LEAST_RISE * Math.max(before, 1e-5);
}

function shareOf(spans: readonly Span[], durationSeconds: number): number {
  const blocks = Math.max(1, Math.ceil(durationSeconds / SHARE_SECONDS));
  const touched = new Set<number>();
  for (const span of spans) {
    const last = Math.floor((span.startSeconds + span.durationSeconds) / SHARE_SECONDS);
    for (let b = Math.floor(span.startSeconds / SHARE_SECONDS); b <= last; b++) touched.add(b);
  }
  return touched.size / blocks;
}
