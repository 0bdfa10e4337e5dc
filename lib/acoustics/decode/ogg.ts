import { FLACDecoder } from '@wasm-audio-decoders/flac';
import { OggVorbisDecoder } from '@wasm-audio-decoders/ogg-vorbis';
import { OggOpusDecoder } from 'ogg-opus-decoder';
import { readStreamInfo } from './flacHeader';
import { type PackedDecoder, type PackedFacts, PackedReader } from './packed';
import { type DecoderOptions, type Reader, type ReaderResult, Unreadable } from './types';

/** The first page's first packet begins here when its segment table has one entry (RFC 3533, 6). */
const HEAD_BYTES = 128;

type Codec = 'opus' | 'vorbis' | 'flac';

function codecOf(head: Uint8Array): Codec {
  const packet = 27 + (head[26] ?? 0);
  const text = String.fromCharCode(...head.subarray(packet, packet + 8));
  if (text === 'OpusHead') return 'opus';
  if (text.slice(1, 7) === 'vorbis') return 'vorbis';
  if (text.slice(1, 5) === 'FLAC') return 'flac';
  throw new Unreadable('ogg-codec-unknown');
}

function factsOf(codec: Codec, head: Uint8Array): PackedFacts {
  if (codec === 'flac') {
    // The Ogg mapping of FLAC (RFC 9639, 10.1) puts nine bytes before the marker.
    const packet = 27 + (head[26] ?? 0);
    const info = readStreamInfo(head.subarray(packet + 17));
    return { ...info, container: 'ogg', encoding: 'flac', lossy: false, declaredFrames: info.totalFrames };
  }
  return {
    container: 'ogg',
    encoding: codec,
    lossy: true,
    bitDepth: null,
    sampleRateHz: null,
    channels: null,
    declaredFrames: null,
  };
}

const decoderOf = (codec: Codec): PackedDecoder =>
  codec === 'opus' ? new OggOpusDecoder() : codec === 'vorbis' ? new OggVorbisDecoder() : new FLACDecoder();

/** Ogg: the codec is known only from its first packet, so the decoder is chosen when that is there. */
export class OggReader implements Reader {
  #head = new Uint8Array(0);
  #reader: PackedReader | null = null;
  #failure: string | null = null;

  constructor(private readonly options: DecoderOptions) {}

  async push(bytes: Uint8Array): Promise<void> {
    if (this.#failure) return;
    if (this.#reader) return await this.#reader.push(bytes);
    const joined = new Uint8Array(this.#head.length + bytes.length);
    joined.set(this.#head);
    joined.set(bytes, this.#head.length);
    this.#head = joined;
    if (joined.length >= HEAD_BYTES) await this.#choose();
  }

  async #choose(): Promise<void> {
    try {
      const codec = codecOf(this.#head);
      this.#reader = new PackedReader(
        this.options,
        () => decoderOf(codec),
        0,
        (head) => factsOf(codec, head),
      );
      await this.#reader.push(this.#head);
    } catch (error) {
      if (!(error instanceof Unreadable)) throw error;
      this.#failure = error.reason;
    }
  }

  async end(): Promise<ReaderResult> {
    if (!this.#reader && !this.#failure) await this.#choose();
    if (this.#reader) return await this.#reader.end();
    return {
      failure: 'unreadable',
      reason: this.#failure ?? 'ogg-codec-unknown',
      format: null,
      frames: 0,
      missingFrames: 0,
      nonFinite: 0,
    };
  }
}
