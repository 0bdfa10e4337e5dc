import type { AudioBlock, AudioFormat } from '../types';
import { id3Length, isContainer, matchesMediaType, SNIFFED_BYTES, sniffContainer } from './sniff';
import type {
  AudioDecoder,
  DecodeLimits,
  DecodeResult,
  DecoderOptions,
  Reader,
  ReaderResult,
  Sniffed,
} from './types';
import { WavReader } from './wav';

export { mediaTypesOf, sniffContainer } from './sniff';
export type { AudioDecoder, DecodeResult } from './types';

/** Tags that follow on each other in front of the sound: beyond so many there is none. */
const MOST_TAGS = 8;

/**
 * A streaming decoder for WAV (PCM 8 to 32 bit, float, A-law, mu-law, extensible), RF64 and BW64, FLAC, Ogg (Opus,
 * Vorbis, FLAC) and MP3. What the file is comes from its bytes, never from its name or media type.
 */
export function createDecoder(options: DecoderOptions): AudioDecoder {
  return new SniffingDecoder(options);
}

/** Looks at the first bytes, chooses a reader, and hands everything on to it. */
class SniffingDecoder implements AudioDecoder {
  #head = new Uint8Array(SNIFFED_BYTES);
  #filled = 0;
  /** Bytes of a tag in front of the sound that are still to be passed over. */
  #tagLeft = 0;
  #tags = 0;
  #sniffed: Sniffed = 'nothing';
  #settled = false;
  #reader: Reader | null = null;
  #format: AudioFormat | null = null;
  readonly #options: DecoderOptions;

  constructor(options: DecoderOptions) {
    this.#options = {
      ...options,
      onFormat: (format) => {
        this.#format = format;
        options.onFormat(format);
      },
    };
  }

  push(given: Uint8Array): void | Promise<void> {
    // A plain view: Node's Buffer is slower to cut.
    let bytes = new Uint8Array(given.buffer, given.byteOffset, given.byteLength);
    while (bytes.length > 0 && !this.#settled) {
      if (this.#tagLeft > 0) {
        const passed = Math.min(this.#tagLeft, bytes.length);
        this.#tagLeft -= passed;
        bytes = bytes.subarray(passed);
        continue;
      }
      const taken = Math.min(bytes.length, SNIFFED_BYTES - this.#filled);
      this.#head.set(bytes.subarray(0, taken), this.#filled);
      this.#filled += taken;
      bytes = bytes.subarray(taken);
      if (this.#filled === SNIFFED_BYTES) {
        const begun = this.#settle();
        const rest = bytes;
        if (begun) return begun.then(() => this.push(rest));
      }
    }
    return bytes.length > 0 ? this.#reader?.push(bytes) : undefined;
  }

  /** Passes a tag over, or chooses the reader and gives it what was read to choose it. */
  #settle(): void | Promise<void> {
    const head = this.#head.slice(0, this.#filled);
    this.#filled = 0;
    const tag = id3Length(head);
    if (tag > 0 && this.#tags < MOST_TAGS) {
      this.#tags++;
      this.#sniffed = 'mp3';
      this.#tagLeft = tag;
      return this.#again(head);
    }
    this.#settled = true;
    const sniffed = sniffContainer(head);
    // Behind a tag only MP3 hides its beginning: its reader looks for a frame.
    this.#sniffed = this.#tags > 0 && !isContainer(sniffed) ? 'mp3' : sniffed;
    if (this.#sniffed === 'wav' || this.#sniffed === 'rf64' || this.#sniffed === 'bw64') {
      this.#reader = new WavReader(this.#options);
      return this.#reader.push(head);
    }
    if (!isContainer(this.#sniffed)) return;
    return packedReader(this.#sniffed, this.#options).then((reader) => {
      this.#reader = reader;
      return reader.push(head);
    });
  }

  /** What was read for a head may reach behind the tag. */
  #again(head: Uint8Array): void | Promise<void> {
    const passed = Math.min(this.#tagLeft, head.length);
    this.#tagLeft -= passed;
    return this.push(head.subarray(passed));
  }

  async end(): Promise<DecodeResult> {
    const given = this.#filled > 0 || this.#settled || this.#tags > 0;
    if (!this.#settled && this.#filled > 0) await this.#settle();
    // A tag at the very end of what there was may have left a head that is short.
    if (!this.#settled && this.#filled > 0) await this.#settle();
    const result: ReaderResult = (await this.#reader?.end()) ?? {
      failure: 'unreadable',
      reason: given ? (this.#tags > 0 ? 'no-frames' : `content-is-${this.#sniffed}`) : 'no-bytes',
      format: null,
      frames: 0,
      missingFrames: 0,
      nonFinite: 0,
    };
    const format = result.format ?? this.#format;
    if (format && this.#tags > 0 && this.#sniffed !== 'mp3')
      format.oddities = [...new Set([...format.oddities, 'tag-before-sound'])].sort();
    const { declaredMediaType } = this.#options;
    return {
      ok: result.failure === null,
      failure: result.failure,
      reason: result.reason,
      format,
      frames: result.frames,
      declaredFrames: format?.declaredFrames ?? null,
      missingFrames: result.missingFrames,
      nonFinite: result.nonFinite,
      sniffed: this.#sniffed,
      typeMatches:
        declaredMediaType === undefined ||
        matchesMediaType(declaredMediaType, this.#sniffed, format?.encoding ?? null),
    };
  }
}

/** The readers of packed sound bring decoders along; they are loaded when a file asks for them. */
async function packedReader(sniffed: 'flac' | 'ogg' | 'mp3', options: DecoderOptions): Promise<Reader> {
  if (sniffed === 'flac') return new (await import('./flac')).FlacReader(options);
  if (sniffed === 'ogg') return new (await import('./ogg')).OggReader(options);
  return await (await import('./mp3')).Mp3Reader.create(options);
}

/** Decode a whole file that is in memory. Channels are empty where it cannot be read. */
export async function decodeWhole(
  bytes: Uint8Array,
  declaredMediaType?: string,
  limits?: Partial<DecodeLimits>,
): Promise<DecodeResult & { channels: Float32Array[] }> {
  const pieces: Float32Array[][] = [];
  const onBlock = (block: AudioBlock) => {
    block.forEach((channel, c) => {
      pieces[c] ??= [];
      pieces[c].push(channel.slice());
    });
  };
  const decoder = createDecoder({
    onFormat: () => undefined,
    onBlock,
    totalBytes: bytes.length,
    ...(declaredMediaType === undefined ? {} : { declaredMediaType }),
    ...(limits === undefined ? {} : { limits }),
  });
  await decoder.push(bytes);
  const result = await decoder.end();
  return { ...result, channels: pieces.map(joined) };
}

function joined(parts: Float32Array[]): Float32Array {
  const whole = new Float32Array(parts.reduce((sum, part) => sum + part.length, 0));
  let at = 0;
  for (const part of parts) {
    whole.set(part, at);
    at += part.length;
  }
  return whole;
}
