import type { AudioBlock, AudioFormat, Container } from '../types';

/** What a file is by its first bytes. */
export type Sniffed =
  | Container
  | 'riff-other'
  | 'text'
  | 'html'
  | 'image'
  | 'archive'
  | 'document'
  | 'mp4'
  | 'aac'
  | 'aiff'
  | 'matroska'
  | 'sound-other'
  | 'unknown'
  | 'nothing';

/** `unreadable`: no sound can be made of it; `empty`: readable, without a sample; `refused-limits`: too much of it. */
export type DecodeFailure = 'unreadable' | 'empty' | 'refused-limits';

export interface DecodeResult {
  ok: boolean;
  failure: null | DecodeFailure;
  /** Why, as a short kebab-case word (`rate-out-of-range`); empty when all is well. */
  reason: string;
  /** The object that `onFormat` had; its oddities are complete now. */
  format: AudioFormat | null;
  /** Frames (samples a channel) that came out. */
  frames: number;
  declaredFrames: number | null;
  /** Frames that the file speaks of and that are not there; 0 when none are missing or nothing is said. */
  missingFrames: number;
  /** Samples that were NaN or infinite in the file; each was taken as 0. */
  nonFinite: number;
  sniffed: Sniffed;
  /** Whether the content is what the media type said; true when none was given. */
  typeMatches: boolean;
}

/** Bounds on what one file may ask of the decoder. */
export interface DecodeLimits {
  longestSeconds: number;
  /** Samples over all channels that any file may hold, however well it is packed. */
  freeSamples: number;
  /** Beyond `freeSamples`: samples over all channels for each byte of the file (a decompression bomb has more). */
  samplesPerByte: number;
}

/** Engineering choices, no source: silence packed as FLAC in blocks of 4,096 has about 300 samples a byte. */
export const DEFAULT_LIMITS: DecodeLimits = {
  longestSeconds: 24 * 3600,
  freeSamples: 50_000_000,
  samplesPerByte: 400,
};

/** Bounds of a format that makes sense at all; engineering choices, no source. */
export const LOWEST_RATE_HZ = 500;
export const HIGHEST_RATE_HZ = 192_000;
export const MOST_CHANNELS = 8;

export interface DecoderOptions {
  /** Called once, before the first block, as soon as the format is known. */
  onFormat(format: AudioFormat): void;
  /** Planar blocks in units of full scale. The arrays are reused: copy what you keep. What it throws goes through. */
  onBlock(block: AudioBlock): void;
  declaredMediaType?: string;
  /** Length of the file where it is known: tells a size that was left open from a real one near the same number. */
  totalBytes?: number;
  limits?: Partial<DecodeLimits>;
  /** Where a channel's blocks are to be written: an array of the length asked for. Asked for once a channel. */
  roomFor?: (channel: number, frames: number) => Float32Array;
  /** A quicker way for the commonest samples: interleaved 16-bit little-endian codes to one channel from `at` on. */
  spread16?: (bytes: Uint8Array, frames: number, channel: number, channels: number, at: number) => void;
}

/**
 * A decoder that is fed the bytes of a file in order, in pieces of any size, and never holds the whole of it. It
 * neither throws on hostile bytes nor believes a declared size: what a file is worth is said at the end. Where `push`
 * returns a promise, the next call waits for it.
 */
export interface AudioDecoder {
  push(bytes: Uint8Array): void | Promise<void>;
  end(): DecodeResult | Promise<DecodeResult>;
}

/** What one container's reader says at its end. */
export interface ReaderResult {
  failure: null | DecodeFailure;
  reason: string;
  format: AudioFormat | null;
  frames: number;
  missingFrames: number;
  nonFinite: number;
}

export interface Reader {
  push(bytes: Uint8Array): void | Promise<void>;
  end(): ReaderResult | Promise<ReaderResult>;
}

/** Why a file that is of a known kind cannot be read. Thrown inside readers only. */
export class Unreadable extends Error {
  constructor(
    readonly reason: string,
    readonly failure: 'unreadable' | 'refused-limits' = 'unreadable',
  ) {
    super(reason);
  }
}

/** @throws Unreadable `rate-out-of-range`, `channels-out-of-range` */
export function checkFormat(sampleRateHz: number, channels: number): void {
  if (!(sampleRateHz >= LOWEST_RATE_HZ && sampleRateHz <= HIGHEST_RATE_HZ))
    throw new Unreadable('rate-out-of-range');
  if (!(channels >= 1 && channels <= MOST_CHANNELS)) throw new Unreadable('channels-out-of-range');
}
