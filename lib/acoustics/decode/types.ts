import type { AudioBlock, AudioFormat, Container } from '../types';

export type Sniffed =
  | Container
  | 'riff-other'
  | 'text'
  | 'html'
  | 'image'
  | 'archive'
  | 'mp4'
  | 'aiff'
  | 'unknown'
  | 'nothing';

export interface DecodeResult {
  ok: boolean;
  /** `empty`: a readable file without a sample. */
  failure: null | 'unreadable' | 'empty';
  /** Why, as a short kebab-case word (`rate-out-of-range`); empty when all is well. */
  reason: string;
  format: AudioFormat | null;
  frames: number;
  declaredFrames: number | null;
  /** Frames that are declared and not there; 0 when none are missing or none are declared. */
  missingFrames: number;
  sniffed: Sniffed;
  /** Whether the content is what the media type said. */
  typeMatches: boolean;
}

export interface DecoderOptions {
  onFormat(format: AudioFormat): void;
  /** Planar blocks in units of full scale. The arrays are reused: copy what you keep. */
  onBlock(block: AudioBlock): void;
  declaredMediaType?: string;
}

/**
 * A decoder that is fed the bytes of a file in order, in pieces of any size, and never holds the whole of it. It
 * neither throws on hostile bytes nor believes a declared size: what a file is worth is said at the end.
 */
export interface AudioDecoder {
  push(bytes: Uint8Array): void | Promise<void>;
  end(): DecodeResult | Promise<DecodeResult>;
}

/** What one container's reader says at its end. */
export interface ReaderResult {
  failure: null | 'unreadable' | 'empty';
  reason: string;
  format: AudioFormat | null;
  frames: number;
  missingFrames: number;
}

export interface Reader {
  push(bytes: Uint8Array): void | Promise<void>;
  end(): ReaderResult | Promise<ReaderResult>;
}

/** Why a file that is of a known kind cannot be read. Thrown inside readers only. */
export class Unreadable extends Error {
  constructor(readonly reason: string) {
    super(reason);
  }
}

export const LIMITS = {
  lowestRateHz: 500,
  highestRateHz: 192_000,
  mostChannels: 8,
  /** A day at 4 kHz and more: beyond it a decoder is being bombed. */
  mostFrames: 24 * 3600 * 48_000,
} as const;

/** @throws Unreadable */
export function checkFormat(sampleRateHz: number, channels: number): void {
  if (!(sampleRateHz >= LIMITS.lowestRateHz && sampleRateHz <= LIMITS.highestRateHz))
    throw new Unreadable('rate-out-of-range');
  if (!(channels >= 1 && channels <= LIMITS.mostChannels)) throw new Unreadable('channels-out-of-range');
}
