/** Header of one MPEG audio layer III frame (ISO/IEC 11172-3, 2.4.1.3 and 13818-3; from memory). */
export interface Mp3Header {
  sampleRateHz: number;
  channels: number;
  /** Frames (samples a channel) that it decodes to. */
  samples: number;
  /** Length with its header. */
  bytes: number;
  /** Where a tag of the encoder would stand, behind header, checksum and side information. */
  tagAt: number;
}

const RATES_HZ = [44_100, 48_000, 32_000];
const KBITS_1 = [0, 32, 40, 48, 56, 64, 80, 96, 112, 128, 160, 192, 224, 256, 320];
const KBITS_2 = [0, 8, 16, 24, 32, 40, 48, 56, 64, 80, 96, 112, 128, 144, 160];

export const MP3_HEADER_BYTES = 4;

/** @returns null where no frame of a known length begins */
export function readMp3Header(bytes: Uint8Array, at: number): Mp3Header | null {
  const b1 = bytes[at + 1] ?? 0;
  const b2 = bytes[at + 2] ?? 0;
  const version = (b1 >> 3) & 3;
  // Sync, layer III, a version that is not reserved.
  if (bytes[at] !== 0xff || (b1 & 0xe6) !== 0xe2 || version === 1) return null;
  const first = version === 3;
  const kbits = (first ? KBITS_1 : KBITS_2)[b2 >> 4];
  const base = RATES_HZ[(b2 >> 2) & 3];
  if (!kbits || !base) return null;
  const sampleRateHz = first ? base : version === 2 ? base / 2 : base / 4;
  const channels = (bytes[at + 3] ?? 0) >> 6 === 3 ? 1 : 2;
  const samples = first ? 1152 : 576;
  const checksum = (b1 & 1) === 0 ? 2 : 0;
  const side = first ? (channels === 1 ? 17 : 32) : channels === 1 ? 9 : 17;
  return {
    sampleRateHz,
    channels,
    samples,
    bytes: Math.floor((samples * 125 * kbits) / sampleRateHz) + ((b2 >> 1) & 1),
    tagAt: MP3_HEADER_BYTES + checksum + side,
  };
}

/** What an encoder's tag in place of the first frame says. */
export interface Mp3Tag {
  /** Frames of the codec that follow; null: not said. */
  codecFrames: number | null;
  /** Samples a channel that encoder and decoder put before the sound, and the encoder behind it. */
  delay: number;
  padding: number;
}

/** What a layer III decoder puts before the first sample (LAME's documentation, from memory). */
const DECODER_DELAY = 529;

/**
 * The Xing or Info tag with its extension for gapless playing, or a VBRI tag (their makers' descriptions, from memory).
 *
 * @param frame the whole first frame
 * @returns null where the frame is sound
 */
export function readMp3Tag(frame: Uint8Array, header: Mp3Header): Mp3Tag | null {
  const text = (at: number) => String.fromCharCode(...frame.subarray(at, at + 4));
  const view = new DataView(frame.buffer, frame.byteOffset, frame.byteLength);
  const word = (at: number) => (at + 4 <= frame.length ? view.getUint32(at) : 0);
  if (text(36) === 'VBRI') return { codecFrames: word(50) || null, delay: 0, padding: 0 };
  const name = text(header.tagAt);
  if (name !== 'Xing' && name !== 'Info') return null;
  const flags = word(header.tagAt + 4);
  const extensionAt =
    header.tagAt +
    8 +
    (flags & 1 ? 4 : 0) +
    (flags & 2 ? 4 : 0) +
    (flags & 4 ? 100 : 0) +
    (flags & 8 ? 4 : 0);
  const gaps = /^L(AME|avc|avf)/.test(text(extensionAt)) ? word(extensionAt + 21) >>> 8 : 0;
  const delay = gaps >> 12;
  const padding = gaps & 0xfff;
  return {
    codecFrames: flags & 1 ? word(header.tagAt + 8) || null : null,
    delay: gaps > 0 ? delay + DECODER_DELAY : 0,
    padding: gaps > 0 ? Math.max(0, padding - DECODER_DELAY) : 0,
  };
}
