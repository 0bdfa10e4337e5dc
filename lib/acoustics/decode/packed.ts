import type { AudioFormat, Container, Encoding } from '../types';
import { checkFormat, type DecoderOptions, type Reader, type ReaderResult, Unreadable } from './types';

/** What the well-kept WebAssembly decoders have in common. */
export interface PackedDecoder {
  ready: Promise<void>;
  decode(data: Uint8Array): Decoded | Promise<Decoded>;
  flush?(): Decoded | Promise<Decoded>;
  free(): void;
}
export interface Decoded {
  channelData: Float32Array[];
  samplesDecoded: number;
  sampleRate: number;
  errors: readonly unknown[];
}

export interface PackedFacts {
  container: Container;
  encoding: Encoding;
  lossy: boolean;
  bitDepth: number | null;
  declaredFrames: number | null;
  /** Rate the header declares; null: take the decoder's. */
  sampleRateHz: number | null;
  channels: number | null;
}

/** Bytes given to a decoder at once: bounds what one call may expand to. */
const PIECE_BYTES = 64 * 1024;

/**
 * FLAC, Ogg and MP3 through their decoders, in pieces. They give no error on a truncated file, so frames are counted
 * against what the header declares.
 */
export class PackedReader implements Reader {
  #decoder: PackedDecoder | null = null;
  #head = new Uint8Array(0);
  #facts: PackedFacts | null = null;
  #format: AudioFormat | null = null;
  #frames = 0;
  #oddities = new Set<string>();
  #failure: Unreadable | null = null;

  /**
   * @param headBytes as many bytes as `readHead` wants to see
   * @param readHead header facts out of the first bytes; throws Unreadable
   */
  constructor(
    private readonly options: DecoderOptions,
    private readonly create: () => PackedDecoder,
    private readonly headBytes: number,
    private readonly readHead: (head: Uint8Array) => PackedFacts,
  ) {}

  async push(bytes: Uint8Array): Promise<void> {
    if (this.#failure) return;
    await this.#guarded(async () => {
      if (!this.#facts) {
        const joined = new Uint8Array(this.#head.length + bytes.length);
        joined.set(this.#head);
        joined.set(bytes, this.#head.length);
        this.#head = joined;
        if (joined.length < this.headBytes) return;
        await this.#begin();
        return;
      }
      await this.#feed(bytes);
    });
  }

  async #begin(): Promise<void> {
    this.#facts = this.readHead(this.#head);
    this.#decoder = this.create();
    await this.#decoder.ready;
    const head = this.#head;
    this.#head = new Uint8Array(0);
    await this.#feed(head);
  }

  async #feed(bytes: Uint8Array): Promise<void> {
    for (let at = 0; at < bytes.length; at += PIECE_BYTES) {
      const decoded = await this.#decoder?.decode(bytes.subarray(at, at + PIECE_BYTES));
      if (decoded) this.#take(decoded);
    }
  }

  #take(decoded: Decoded): void {
    if (decoded.errors.length > 0) this.#oddities.add('frames-damaged');
    if (decoded.samplesDecoded === 0 || decoded.channelData.length === 0) return;
    const facts = this.#facts as PackedFacts;
    if (!this.#format) {
      const sampleRateHz = facts.sampleRateHz ?? decoded.sampleRate;
      const channels = facts.channels ?? decoded.channelData.length;
      checkFormat(sampleRateHz, channels);
      this.#format = {
        container: facts.container,
        encoding: facts.encoding,
        lossy: facts.lossy,
        sampleRateHz,
        channels,
        bitDepth: facts.bitDepth,
        declaredFrames: facts.declaredFrames,
        oddities: [],
      };
      this.options.onFormat(this.#format);
    }
    const channels = decoded.channelData.slice(0, this.#format.channels);
    if (channels.length < this.#format.channels) throw new Unreadable('channels-change');
    this.#frames += decoded.samplesDecoded;
    if (this.#frames > 24 * 3600 * 48_000) throw new Unreadable('too-long');
    this.options.onBlock(channels);
  }

  async #guarded(work: () => Promise<void>): Promise<void> {
    try {
      await work();
    } catch (error) {
      // A decoder that throws on what it was given has said that it cannot read it.
      this.#failure = error instanceof Unreadable ? error : new Unreadable('frames-unreadable');
    }
  }

  async end(): Promise<ReaderResult> {
    await this.#guarded(async () => {
      if (!this.#failure && !this.#facts && this.#head.length > 0) await this.#begin();
      const last = await this.#decoder?.flush?.();
      if (last) this.#take(last);
    });
    try {
      this.#decoder?.free();
    } catch {
      // It was broken by what it was given; there is nothing left to free.
    }
    const declared = this.#facts?.declaredFrames ?? null;
    const missingFrames = declared === null ? 0 : Math.max(0, declared - this.#frames);
    if (this.#format) this.#format.oddities = [...this.#oddities].sort();
    if (this.#failure && this.#frames === 0)
      return {
        failure: 'unreadable',
        reason: this.#failure.reason,
        format: null,
        frames: 0,
        missingFrames: 0,
        nonFinite: 0,
      };
    if (this.#frames === 0) {
      const empty = declared === 0;
      return {
        failure: empty ? 'empty' : 'unreadable',
        reason: empty ? 'no-samples' : 'no-frames',
        format: null,
        frames: 0,
        missingFrames,
        nonFinite: 0,
      };
    }
    return {
      failure: null,
      reason: '',
      format: this.#format,
      frames: this.#frames,
      missingFrames,
      nonFinite: 0,
    };
  }
}
