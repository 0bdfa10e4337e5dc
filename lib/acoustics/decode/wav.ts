import type { AudioFormat } from '../types';
import { type SampleReader, sampleReader } from './samples';
import { type DecoderOptions, LIMITS, type Reader, type ReaderResult, Unreadable } from './types';
import { containerOf, readWavFormat, type WavFormat } from './wavFormat';

const BLOCK_FRAMES = 16_384;
/** A fmt or ds64 chunk is small; one that claims more is read no further than this. */
const LARGEST_COLLECTED_BYTES = 65_536;
/** Sound that comes before its format is kept this far, then given up. */
const LARGEST_EARLY_SOUND_BYTES = 32 << 20;
/** Sizes that writers put down when they cannot come back to correct them: none, all ones, or the largest signed one. */
const isStreamedSize = (size: number) =>
  size === 0 || size >= 0xffff_fff0 || (size >= 0x7fff_0000 && size <= 0x7fff_ffff);

type State = 'riff' | 'chunk' | 'collect' | 'skip' | 'data' | 'tail';

/**
 * WAV, RF64 and BW64 (EBU Tech 3306), read as a stream. Chunk sizes are 64-bit safe numbers and never allocate;
 * chunks may come in any order, with or without their pad byte; a data size of 0 or near 2^32 means "to the end".
 */
export class WavReader implements Reader {
  #state: State = 'riff';
  /** Bytes of a head or a small chunk that are not all there yet. */
  #pending = new Uint8Array(0);
  #bigEndian = false;
  #magic = 'RIFF';
  #riffSize = 0;
  #position = 0;
  #chunk = '';
  #chunkLeft = 0;
  #pad = 0;
  #ds64: { riffSize: number; dataSize: number } | null = null;
  #format: WavFormat | null = null;
  #audio: AudioFormat | null = null;
  #read: SampleReader | null = null;
  #blocks: Float32Array[] = [];
  #rest = new Uint8Array(0);
  #early: Uint8Array[] | null = null;
  #earlyBytes = 0;
  #sawData = false;
  #dataDeclared: number | null = null;
  #dataBytes = 0;
  #frames = 0;
  #chunks: string[] = [];
  #oddities = new Set<string>();
  #failure: Unreadable | null = null;

  constructor(private readonly options: DecoderOptions) {}

  push(bytes: Uint8Array): void {
    if (this.#failure) return;
    try {
      let at = 0;
      while (at < bytes.length) at += this.#step(at === 0 ? bytes : bytes.subarray(at));
      this.#position += bytes.length;
    } catch (error) {
      if (!(error instanceof Unreadable)) throw error;
      this.#failure = error;
    }
  }

  /** Take some of the bytes. @returns how many */
  #step(bytes: Uint8Array): number {
    switch (this.#state) {
      case 'riff':
        return this.#gather(bytes, 12, (head) => this.#onRiff(head));
      case 'chunk':
        return this.#gather(bytes, 8, (head) => this.#onChunkHead(head));
      case 'collect':
        return this.#gather(bytes, this.#chunkLeft, (body) => this.#onCollected(body));
      case 'skip': {
        const taken = Math.min(bytes.length, this.#chunkLeft);
        this.#chunkLeft -= taken;
        if (this.#chunkLeft === 0) this.#state = 'chunk';
        return taken;
      }
      case 'data': {
        const taken = Math.min(bytes.length, this.#chunkLeft);
        this.#onData(taken === bytes.length ? bytes : bytes.subarray(0, taken));
        this.#chunkLeft -= taken;
        if (this.#chunkLeft === 0) this.#endOfData();
        return taken;
      }
      case 'tail':
        this.#oddities.add('trailing-bytes');
        return bytes.length;
    }
  }

  #gather(bytes: Uint8Array, wanted: number, whole: (body: Uint8Array) => void): number {
    if (this.#pending.length === 0 && bytes.length >= wanted) {
      whole(bytes.subarray(0, wanted));
      return wanted;
    }
    const taken = Math.min(bytes.length, wanted - this.#pending.length);
    const joined = new Uint8Array(this.#pending.length + taken);
    joined.set(this.#pending);
    joined.set(bytes.subarray(0, taken), this.#pending.length);
    this.#pending = joined;
    if (joined.length === wanted) {
      this.#pending = new Uint8Array(0);
      whole(joined);
    }
    return taken;
  }

  #onRiff(head: Uint8Array): void {
    this.#magic = String.fromCharCode(...head.subarray(0, 4));
    this.#bigEndian = this.#magic === 'RIFX';
    this.#riffSize = new DataView(head.buffer, head.byteOffset, 12).getUint32(4, !this.#bigEndian);
    if (String.fromCharCode(...head.subarray(8, 12)) !== 'WAVE') throw new Unreadable('not-wave');
    this.#state = 'chunk';
  }

  #onChunkHead(head: Uint8Array): void {
    // A chunk of odd size is followed by a pad byte that its size does not count (RIFF). Writers forget it: where the
    // byte after an odd chunk begins a plausible name, there was none.
    if (this.#pad === 1) {
      this.#pad = 0;
      if (head[0] === 0 || !isName(head)) {
        this.#pending = head.slice(1);
        return;
      }
      this.#oddities.add('pad-byte-missing');
    }
    this.#chunk = String.fromCharCode(...head.subarray(0, 4));
    const size = new DataView(head.buffer, head.byteOffset, 8).getUint32(4, !this.#bigEndian);
    if (!isName(head)) {
      this.#oddities.add(this.#sawData ? 'trailing-bytes' : 'chunk-name-odd');
      if (this.#sawData) {
        this.#state = 'tail';
        return;
      }
      if (this.#chunks.length > 64) throw new Unreadable('chunks-senseless');
    }
    if (this.#chunks.length < 1024) this.#chunks.push(this.#chunk);
    this.#pad = size % 2;
    if (this.#chunk === 'data') {
      this.#beginData(size);
      return;
    }
    if (this.#chunk === 'fmt ' || this.#chunk === 'ds64') {
      if (size > LARGEST_COLLECTED_BYTES) throw new Unreadable('format-too-long');
      if (size === 0) throw new Unreadable('format-short');
      this.#chunkLeft = size;
      this.#state = 'collect';
      return;
    }
    this.#chunkLeft = size;
    this.#state = size === 0 ? 'chunk' : 'skip';
  }

  #onCollected(body: Uint8Array): void {
    this.#state = 'chunk';
    if (this.#chunk === 'ds64') {
      if (body.byteLength < 24) throw new Unreadable('ds64-short');
      const view = new DataView(body.buffer, body.byteOffset, body.byteLength);
      this.#ds64 = {
        riffSize: Number(view.getBigUint64(0, true)),
        dataSize: Number(view.getBigUint64(8, true)),
      };
      return;
    }
    if (this.#format) {
      this.#oddities.add('format-twice');
      return;
    }
    this.#format = readWavFormat(body, this.#bigEndian);
    if (this.#sawData) this.#oddities.add('data-before-format');
    this.#announce();
    const early = this.#early;
    this.#early = null;
    for (const piece of early ?? []) this.#onData(piece);
  }

  #beginData(size: number): void {
    if (this.#sawData) {
      this.#oddities.add('data-twice');
      this.#chunkLeft = size;
      this.#state = size === 0 ? 'chunk' : 'skip';
      return;
    }
    this.#sawData = true;
    const long =
      this.#magic !== 'RIFF' && this.#magic !== 'RIFX' && size === 0xffff_ffff && this.#ds64
        ? this.#ds64.dataSize
        : null;
    if (long !== null) this.#dataDeclared = long;
    else if (isStreamedSize(size)) this.#dataDeclared = null;
    else this.#dataDeclared = size;
    if (this.#dataDeclared === null) this.#oddities.add('data-size-open');
    this.#chunkLeft = this.#dataDeclared ?? Number.POSITIVE_INFINITY;
    this.#pad = this.#dataDeclared === null ? 0 : this.#dataDeclared % 2;
    this.#state = 'data';
    if (this.#format) this.#announce();
    else this.#early = [];
    if (this.#chunkLeft === 0) this.#endOfData();
  }

  /** Say the format once both it and the length of the sound are known. */
  #announce(): void {
    const format = this.#format;
    if (!format || !this.#sawData || this.#audio) return;
    for (const oddity of format.oddities) this.#oddities.add(oddity);
    this.#audio = {
      container: containerOf(this.#magic),
      encoding: format.encoding,
      lossy: format.encoding === 'alaw' || format.encoding === 'mulaw',
      sampleRateHz: format.sampleRateHz,
      channels: format.channels,
      bitDepth: format.bitDepth,
      declaredFrames:
        this.#dataDeclared === null ? null : Math.floor(this.#dataDeclared / format.bytesPerFrame),
      oddities: [],
    };
    this.#read = sampleReader(format.encoding, format.bytesPerSample, format.channels, this.#bigEndian);
    this.#blocks = Array.from({ length: format.channels }, () => new Float32Array(BLOCK_FRAMES));
    this.options.onFormat(this.#audio);
  }

  #onData(bytes: Uint8Array): void {
    const format = this.#format;
    if (!format || !this.#read) {
      this.#earlyBytes += bytes.length;
      if (this.#earlyBytes > LARGEST_EARLY_SOUND_BYTES) throw new Unreadable('no-format');
      this.#early?.push(bytes.slice());
      return;
    }
    this.#dataBytes += bytes.length;
    let all = bytes;
    if (this.#rest.length > 0) {
      all = new Uint8Array(this.#rest.length + bytes.length);
      all.set(this.#rest);
      all.set(bytes, this.#rest.length);
    }
    const frames = Math.floor(all.length / format.bytesPerFrame);
    for (let done = 0; done < frames; done += BLOCK_FRAMES) {
      const now = Math.min(BLOCK_FRAMES, frames - done);
      this.#read(
        all.subarray(done * format.bytesPerFrame, (done + now) * format.bytesPerFrame),
        now,
        this.#blocks,
      );
      if (format.encoding.startsWith('float')) this.#mendFloats(now);
      this.options.onBlock(
        now === BLOCK_FRAMES ? this.#blocks : this.#blocks.map((channel) => channel.subarray(0, now)),
      );
    }
    this.#frames += frames;
    if (this.#frames > LIMITS.mostFrames) throw new Unreadable('too-long');
    this.#rest = all.slice(frames * format.bytesPerFrame);
  }

  #mendFloats(frames: number): void {
    for (const channel of this.#blocks) {
      for (let i = 0; i < frames; i++) {
        if (Number.isFinite(channel[i])) continue;
        channel[i] = 0;
        this.#oddities.add('non-finite-samples');
      }
    }
  }

  #endOfData(): void {
    this.#state = 'chunk';
  }

  end(): ReaderResult {
    const none = (failure: 'unreadable' | 'empty', reason: string): ReaderResult => ({
      failure,
      reason,
      format: this.#audio,
      frames: 0,
      missingFrames: 0,
    });
    if (this.#failure) return none('unreadable', this.#failure.reason);
    if (!this.#format) return none('unreadable', 'no-format');
    if (!this.#sawData || !this.#audio) return none('empty', 'no-data');
    const bytesPerFrame = this.#format.bytesPerFrame;
    if (this.#rest.length > 0) this.#oddities.add('partial-frame');
    const onlyPad = this.#pad === 1 && this.#pending.length === 1 && this.#pending[0] === 0;
    if (this.#state === 'chunk' && this.#pending.length > 0 && !onlyPad) this.#oddities.add('trailing-bytes');
    const missing =
      this.#dataDeclared === null
        ? 0
        : Math.max(0, Math.floor(this.#dataDeclared / bytesPerFrame) - this.#frames);
    this.#checkRiffSize(missing);
    if (
      this.#chunks.indexOf('fmt ') > 0 &&
      !['ds64', 'JUNK', 'junk', 'bext', 'LIST', 'fact'].includes(this.#chunks[0] ?? '')
    )
      this.#oddities.add('chunk-order-odd');
    this.#audio.oddities = [...this.#oddities].sort();
    if (this.#frames === 0)
      return { ...none('empty', missing > 0 ? 'data-missing' : 'no-samples'), missingFrames: missing };
    return { failure: null, reason: '', format: this.#audio, frames: this.#frames, missingFrames: missing };
  }

  #checkRiffSize(missingFrames: number): void {
    if (missingFrames > 0) return; // a cut file's size is wrong for that reason alone
    const declared = this.#ds64 ? this.#ds64.riffSize : this.#riffSize;
    if (
      declared !== this.#position - 8 &&
      !(isStreamedSize(declared) && this.#oddities.has('data-size-open'))
    )
      this.#oddities.add('riff-size-wrong');
  }
}

/** Chunk names are four printable ASCII characters. */
const isName = (head: Uint8Array): boolean =>
  [0, 1, 2, 3].every((i) => (head[i] ?? 0) >= 32 && (head[i] ?? 0) < 127);
