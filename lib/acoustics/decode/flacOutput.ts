import type { AudioFormat } from '../types';
import { BlockSink } from './blocks';
import type { FlacFrameDecoder } from './flacFrame';
import type { FrameHeader, StreamInfo } from './flacHeader';
import { type DecoderOptions, type ReaderResult, Unreadable } from './types';

/** Samples of frames that turned out damaged: so many, and so many more for a byte, are looked through. */
const FREE_WASTED_SAMPLES = 64_000_000;
const WASTED_SAMPLES_PER_BYTE = 16;

/** What becomes of a FLAC stream's frames, in a file of its own or in Ogg: sound, and an account of what is missing. */
export class FlacOutput {
  readonly oddities = new Set<string>();
  readonly #sink: BlockSink;
  readonly #scale: number;
  #wasted = 0;
  /** Place of the next frame by the stream's own counting; null before the first. */
  #next: number | null = null;
  #gaps = 0;
  /** Frames in a block of this stream that is cut off by its end. */
  #cut = 0;

  constructor(
    options: DecoderOptions,
    private readonly info: StreamInfo,
    container: 'flac' | 'ogg',
  ) {
    const format: AudioFormat = {
      container,
      encoding: 'flac',
      lossy: false,
      sampleRateHz: info.sampleRateHz,
      channels: info.channels,
      bitDepth: info.bitDepth,
      declaredFrames: info.totalFrames,
      oddities: [],
    };
    this.#sink = new BlockSink(options, format, false);
    this.#scale = 2 ** (1 - info.bitDepth);
    options.onFormat(format);
  }

  /** @throws Unreadable of the kind `refused-limits` */
  take(header: FrameHeader, { channels }: FlacFrameDecoder, bytesSoFar: number): void {
    const at = header.countsSamples
      ? header.number
      : header.number * (this.info.blockSize ?? header.blockSize);
    if (this.#next !== null && at > this.#next) {
      this.#gaps += at - this.#next;
      this.oddities.add('frames-missing');
    }
    this.#next = at + header.blockSize;
    this.#cut = 0;
    const sink = this.#sink;
    for (let done = 0; done < header.blockSize; ) {
      const now = Math.min(sink.room, header.blockSize - done);
      for (let c = 0; c < channels.length; c++) {
        const from = channels[c] as Float64Array;
        const to = sink.channels[c] as Float32Array;
        for (let i = 0, k = sink.filled; i < now; i++, k++) to[k] = (from[done + i] as number) * this.#scale;
      }
      done += now;
      sink.commit(now, bytesSoFar);
    }
  }

  /**
   * A frame was looked through in vain.
   *
   * @throws Unreadable `too-damaged`
   */
  waste(header: FrameHeader, bytesSoFar: number): void {
    this.#wasted += header.blockSize * this.info.channels;
    if (this.#wasted > FREE_WASTED_SAMPLES + WASTED_SAMPLES_PER_BYTE * bytesSoFar)
      throw new Unreadable('too-damaged', 'refused-limits');
  }

  /** @param cut header of the frame that the stream ends in the middle of; null: it is all there, and wrong */
  damaged(cut: FrameHeader | null): void {
    if (cut) this.#cut = cut.blockSize;
    else this.oddities.add('frames-damaged');
  }

  /** Bytes that belong to no frame. @param maybeCut whether they may be the beginning of one that the end cut off */
  refuse(maybeCut: boolean): void {
    const { totalFrames } = this.info;
    const complete = totalFrames !== null && this.#sink.frames >= totalFrames;
    if (complete) this.oddities.add('trailing-bytes');
    else if (!maybeCut && this.#cut === 0) this.oddities.add('stray-bytes');
  }

  /** @param failure why reading was given up, if it was */
  end(failure: Unreadable | null): ReaderResult {
    this.#sink.flush();
    const { frames, format } = this.#sink;
    const total = this.info.totalFrames;
    if (total !== null && frames > total) this.oddities.add('longer-than-declared');
    format.oddities = [...this.oddities].sort();
    // A gap in the counting is only worth as much as a total leaves room for.
    const missingFrames = total === null ? this.#gaps + this.#cut : Math.max(0, total - frames);
    const answer = { format, frames, missingFrames, nonFinite: 0 };
    if (failure) return { ...answer, failure: failure.failure, reason: failure.reason };
    if (frames > 0) return { ...answer, failure: null, reason: '' };
    if (missingFrames > 0) return { ...answer, failure: 'unreadable', reason: 'no-frames' };
    return { ...answer, failure: 'empty', reason: 'no-samples' };
  }
}
