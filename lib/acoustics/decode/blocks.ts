import type { AudioFormat } from '../types';
import { DEFAULT_LIMITS, type DecodeLimits, type DecoderOptions, Unreadable } from './types';

/** Frames a block: 64 KiB a channel, which stays in a processor's second cache. */
export const BLOCK_FRAMES = 16_384;

/**
 * Gathers what a reader decodes into full blocks, whatever pieces it comes in, and holds the limits on how much may
 * come. Every block but the last has BLOCK_FRAMES frames, so that a file gives the same blocks however it was cut.
 */
export class BlockSink {
  readonly channels: Float32Array[];
  /** Frames of the block that are written. */
  filled = 0;
  /** Frames written in all. */
  frames = 0;
  nonFinite = 0;
  readonly #limits: DecodeLimits;
  readonly #mostFrames: number;

  constructor(
    private readonly options: DecoderOptions,
    readonly format: AudioFormat,
    /** Whether samples can be NaN or infinite; each such sample is counted and taken as 0. */
    private readonly mayBeNonFinite: boolean,
  ) {
    this.#limits = { ...DEFAULT_LIMITS, ...options.limits };
    this.#mostFrames = this.#limits.longestSeconds * format.sampleRateHz;
    const { roomFor = (_: number, frames: number) => new Float32Array(frames) } = options;
    this.channels = Array.from({ length: format.channels }, (_, c) => roomFor(c, BLOCK_FRAMES));
  }

  get room(): number {
    return BLOCK_FRAMES - this.filled;
  }

  /**
   * Frames were written to `channels` from `filled` on, no more than there was room for.
   *
   * @param bytesSoFar bytes of the file that all frames so far came out of
   * @throws Unreadable `too-long`, `expands-too-much`
   */
  commit(frames: number, bytesSoFar: number): void {
    if (this.mayBeNonFinite) this.#mend(this.filled, this.filled + frames);
    this.filled += frames;
    this.frames += frames;
    if (this.frames > this.#mostFrames) throw new Unreadable('too-long', 'refused-limits');
    const samples = this.frames * this.channels.length;
    if (samples > this.#limits.freeSamples && samples > bytesSoFar * this.#limits.samplesPerByte)
      throw new Unreadable('expands-too-much', 'refused-limits');
    if (this.filled === BLOCK_FRAMES) this.flush();
  }

  /** Take frames `from` to `to` of planar sound. */
  write(planes: readonly Float32Array[], from: number, to: number, bytesSoFar: number): void {
    for (let at = from; at < to; ) {
      const now = Math.min(to - at, this.room);
      for (let c = 0; c < this.channels.length; c++) {
        const plane = planes[c] as Float32Array;
        (this.channels[c] as Float32Array).set(plane.subarray(at, at + now), this.filled);
      }
      at += now;
      this.commit(now, bytesSoFar);
    }
  }

  /** Hand over what is gathered. */
  flush(): void {
    if (this.filled === 0) return;
    const { filled } = this;
    this.filled = 0;
    this.options.onBlock(
      filled === BLOCK_FRAMES ? this.channels : this.channels.map((channel) => channel.subarray(0, filled)),
    );
  }

  #mend(from: number, to: number): void {
    for (const channel of this.channels) {
      for (let i = from; i < to; i++) {
        const x = channel[i] as number;
        // Only NaN and the infinities differ from themselves here.
        if (x - x === 0) continue;
        channel[i] = 0;
        this.nonFinite++;
      }
    }
  }
}
