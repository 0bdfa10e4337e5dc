import type { AudioFormat } from '../types';
import { BlockSink } from './blocks';
import { type Chunk, type RiffListener, RiffWalker, type Treatment } from './riff';
import { type SampleReader, sampleReader } from './samples';
import { type DecoderOptions, type Reader, type ReaderResult, Unreadable } from './types';
import { containerOf, FORMAT_BYTES, readWavFormat, type WavFormat } from './wavFormat';

/** ds64 without its table (EBU Tech 3306): riffSize, dataSize and sampleCount of 64 bits, and the table's length. */
const DS64_BYTES = 28;
/** Sound that comes before its format is kept this far, then given up. */
const LARGEST_EARLY_SOUND_BYTES = 16 << 20;
/** Chunks that may stand before fmt without remark. */
const BEFORE_FORMAT = new Set(['ds64', 'JUNK', 'junk', 'bext', 'LIST', 'fact', 'FLLR']);

const UNKNOWN_SIZE = 0xffff_ffff;
/** Sizes written by recorders that cannot come back to correct them, beside 0: all ones, or the largest signed one. */
const isOpenSize = (size: number): boolean =>
  size >= 0xffff_fff0 || (size >= 0x7fff_0000 && size <= 0x7fff_ffff);

interface Ds64 {
  riffSize: number;
  dataSize: number;
  sampleCount: number;
}

/**
 * WAV, RF64 and BW64 (EBU Tech 3306), read as a stream. Chunks may come in any order, with or without their pad byte;
 * a data size that was left open means "to the end"; one that lies is found out by counting.
 */
export class WavReader implements Reader, RiffListener {
  sawData = false;
  readonly #walker = new RiffWalker(this);
  readonly #oddities = this.#walker.oddities;
  #magic = 'RIFF';
  #riffSize = 0;
  #ds64: Ds64 | null = null;
  #format: WavFormat | null = null;
  #sink: BlockSink | null = null;
  #read: SampleReader | null = null;
  /** Bytes of a frame that is not all there yet. */
  #rest = new Uint8Array(0);
  #restFilled = 0;
  #early: Uint8Array | null = null;
  #earlyFilled = 0;
  /** null: left open. */
  #dataSize: number | null = null;
  #first = '';
  #failure: Unreadable | null = null;

  constructor(private readonly options: DecoderOptions) {}

  push(bytes: Uint8Array): void {
    if (this.#failure) return;
    try {
      this.#walker.push(bytes);
    } catch (error) {
      if (!(error instanceof Unreadable)) throw error;
      this.#failure = error;
    }
  }

  onRiff(magic: string, size: number): void {
    this.#magic = magic;
    this.#riffSize = size;
  }

  onChunk(chunk: Chunk): Treatment {
    this.#first ||= chunk.name;
    if (chunk.name === 'data') return this.#onDataChunk(chunk);
    // Only a data chunk may be longer than 32 bits say without being in the table of ds64, which nobody fills.
    if (chunk.name === 'fmt ') {
      if (!this.#format && !BEFORE_FORMAT.has(this.#first) && this.#first !== 'fmt ')
        this.#oddities.add('chunk-order-odd');
      return { how: 'collect', size: chunk.size, keep: FORMAT_BYTES };
    }
    if (chunk.name === 'ds64') return { how: 'collect', size: chunk.size, keep: DS64_BYTES };
    return { how: 'skip', size: chunk.size };
  }

  #onDataChunk(chunk: Chunk): Treatment {
    if (this.sawData) {
      this.#oddities.add('data-twice');
      return { how: 'skip', size: chunk.size };
    }
    this.sawData = true;
    this.#dataSize = this.#declaredSize(chunk);
    if (this.#format) this.#announce(this.#format);
    else this.#early = new Uint8Array(0);
    if (chunk.size === 0) return { how: 'doubt' };
    return { how: 'stream', size: this.#dataSize ?? Number.POSITIVE_INFINITY };
  }

  /** Bytes of sound that the file declares; null where it left that open. */
  #declaredSize({ size, bodyAt }: Chunk): number | null {
    if (size === UNKNOWN_SIZE && this.#ds64 && this.#magic !== 'RIFF') {
      const { dataSize } = this.#ds64;
      return dataSize > 0 && dataSize < 2 ** 63 ? dataSize : null;
    }
    if (size === 0) return null;
    if (!isOpenSize(size)) return size;
    const { totalBytes } = this.options;
    return totalBytes !== undefined && bodyAt + size <= totalBytes ? size : null;
  }

  onCollected(chunk: Chunk, body: Uint8Array): void {
    if (chunk.name === 'ds64') {
      if (body.byteLength < 24) throw new Unreadable('ds64-short');
      const view = new DataView(body.buffer, body.byteOffset, body.byteLength);
      const at = (offset: number) => Number(view.getBigUint64(offset, true));
      this.#ds64 = { riffSize: at(0), dataSize: at(8), sampleCount: at(16) };
      return;
    }
    if (this.#format) {
      this.#oddities.add('format-twice');
      return;
    }
    this.#format = readWavFormat(body, this.#walker.bigEndian);
    for (const oddity of this.#format.oddities) this.#oddities.add(oddity);
    if (!this.sawData) return;
    this.#oddities.add('data-before-format');
    this.#announce(this.#format);
    const early = this.#early?.subarray(0, this.#earlyFilled);
    this.#early = null;
    if (early) this.onStream(early);
  }

  /** Say the format, now that both it and the length of the sound are known. */
  #announce(format: WavFormat): void {
    const { encoding, bytesPerSample, bytesPerFrame, channels, sampleRateHz, bitDepth } = format;
    const audio: AudioFormat = {
      container: containerOf(this.#magic),
      encoding,
      lossy: encoding === 'alaw' || encoding === 'mulaw',
      sampleRateHz,
      channels,
      bitDepth,
      declaredFrames: this.#dataSize === null ? null : Math.floor(this.#dataSize / bytesPerFrame),
      oddities: [],
    };
    this.#sink = new BlockSink(this.options, audio, encoding === 'float32' || encoding === 'float64');
    const { spread16 } = this.options;
    this.#read =
      spread16 && bytesPerSample === 2 && encoding === 'pcm-s16' && !this.#walker.bigEndian
        ? (bytes, frames, out, at) => {
            for (let c = 0; c < out.length; c++) spread16(bytes, frames, c, channels, at);
          }
        : sampleReader(encoding, bytesPerSample, channels, this.#walker.bigEndian);
    this.#rest = new Uint8Array(bytesPerFrame);
    this.options.onFormat(audio);
  }

  onStream(bytes: Uint8Array): void {
    if (!this.#sink) {
      this.#keepEarly(bytes);
      return;
    }
    let at = 0;
    const wide = this.#rest.length;
    if (this.#restFilled > 0) {
      at = Math.min(bytes.length, wide - this.#restFilled);
      this.#rest.set(bytes.subarray(0, at), this.#restFilled);
      this.#restFilled += at;
      if (this.#restFilled < wide) return;
      this.#restFilled = 0;
      this.#decode(this.#sink, this.#rest, 1);
    }
    const frames = Math.floor((bytes.length - at) / wide);
    this.#decode(this.#sink, at === 0 ? bytes : bytes.subarray(at), frames);
    at += frames * wide;
    if (at < bytes.length) {
      this.#rest.set(bytes.subarray(at));
      this.#restFilled = bytes.length - at;
    }
  }

  #decode(sink: BlockSink, bytes: Uint8Array, frames: number): void {
    const wide = this.#rest.length;
    for (let done = 0; done < frames; ) {
      const now = Math.min(sink.room, frames - done);
      this.#read?.(bytes.subarray(done * wide, (done + now) * wide), now, sink.channels, sink.filled);
      sink.commit(now, this.#walker.position);
      done += now;
    }
  }

  #keepEarly(bytes: Uint8Array): void {
    const needed = this.#earlyFilled + bytes.length;
    if (needed > LARGEST_EARLY_SOUND_BYTES) throw new Unreadable('no-format');
    if (!this.#early || this.#early.length < needed) {
      const grown = new Uint8Array(Math.min(LARGEST_EARLY_SOUND_BYTES, Math.max(65_536, 2 * needed)));
      if (this.#early) grown.set(this.#early.subarray(0, this.#earlyFilled));
      this.#early = grown;
    }
    this.#early.set(bytes, this.#earlyFilled);
    this.#earlyFilled = needed;
  }

  end(): ReaderResult {
    if (!this.#failure) {
      try {
        this.#walker.end();
      } catch (error) {
        if (!(error instanceof Unreadable)) throw error;
        this.#failure = error;
      }
    }
    this.#sink?.flush();
    const frames = this.#sink?.frames ?? 0;
    const missingFrames = this.#missing(frames);
    if (!this.#failure) this.#compare(frames, missingFrames);
    const audio = this.#sink?.format ?? null;
    if (audio) audio.oddities = [...this.#oddities].sort();
    const answer = (failure: ReaderResult['failure'], reason: string): ReaderResult => ({
      failure,
      reason,
      format: audio,
      frames,
      missingFrames,
      nonFinite: this.#sink?.nonFinite ?? 0,
    });
    if (this.#failure) return answer(this.#failure.failure, this.#failure.reason);
    if (!this.#format) return answer('unreadable', 'no-format');
    if (!this.sawData) return answer('empty', 'no-data');
    if (frames === 0) return answer('empty', missingFrames > 0 ? 'data-missing' : 'no-samples');
    return answer(null, '');
  }

  #missing(frames: number): number {
    if (this.#dataSize === null || !this.#format) return 0;
    return Math.max(0, Math.floor(this.#dataSize / this.#format.bytesPerFrame) - frames);
  }

  /** What the header said against what was there. */
  #compare(frames: number, missingFrames: number): void {
    if (this.#restFilled > 0) this.#oddities.add('partial-frame');
    if (this.#dataSize === null && frames > 0) this.#oddities.add('data-size-open');
    if ((this.#sink?.nonFinite ?? 0) > 0) this.#oddities.add('non-finite-samples');
    if (missingFrames > 0) return; // a cut file's sizes are wrong for that reason alone
    const count = this.#ds64?.sampleCount ?? 0;
    if (count > 0 && count !== frames) this.#oddities.add('sample-count-wrong');
    const declared = this.#riffSize === UNKNOWN_SIZE && this.#ds64 ? this.#ds64.riffSize : this.#riffSize;
    const leftOpen = this.#dataSize === null && frames > 0 && (isOpenSize(declared) || declared === 0);
    if (declared !== this.#walker.position - 8 && !leftOpen) this.#oddities.add('riff-size-wrong');
  }
}
