import type { Container, Encoding } from '../types';
import { checkFormat, Unreadable } from './types';

/** The fmt chunk, read and believed only as far as it agrees with itself. */
export interface WavFormat {
  encoding: Encoding;
  channels: number;
  sampleRateHz: number;
  bytesPerSample: number;
  bitDepth: number;
  bytesPerFrame: number;
  oddities: string[];
}

const PCM = 0x0001;
const FLOAT = 0x0003;
const ALAW = 0x0006;
const MULAW = 0x0007;
const EXTENSIBLE = 0xfffe;

/** Bytes 2 to 15 of the sub-format GUIDs that stand for plain format tags (Microsoft, WAVE_FORMAT_EXTENSIBLE). */
const GUID_TAIL = [0x00, 0x00, 0x00, 0x00, 0x10, 0x00, 0x80, 0x00, 0x00, 0xaa, 0x00, 0x38, 0x9b, 0x71];

/** The longest form that is read: WAVE_FORMAT_EXTENSIBLE. */
export const FORMAT_BYTES = 40;

/**
 * Read a fmt chunk. What a frame is follows from channels and bits; block align and byte rate are only compared.
 *
 * @param body the fmt chunk's bytes; FORMAT_BYTES of them are enough
 * @throws Unreadable `format-short`, `format-unknown`, `bit-depth-unknown`, `rate-out-of-range`, `channels-out-of-range`
 */
export function readWavFormat(body: Uint8Array, bigEndian: boolean): WavFormat {
  if (body.byteLength < 14) throw new Unreadable('format-short');
  const view = new DataView(body.buffer, body.byteOffset, body.byteLength);
  const little = !bigEndian;
  const channels = view.getUint16(2, little);
  const sampleRateHz = view.getUint32(4, little);
  const byteRate = view.getUint32(8, little);
  const blockAlign = view.getUint16(12, little);
  checkFormat(sampleRateHz, channels);
  // The oldest form of the chunk ends before the bits.
  const bits = body.byteLength >= 16 ? view.getUint16(14, little) : (8 * blockAlign) / channels;
  const { tag, valid, oddities } = readTag(body, view, little, bits);
  const telephone = tag === ALAW || tag === MULAW;
  if (telephone && bits !== 8) oddities.push('bits-wrong');
  const bytesPerSample = telephone ? 1 : storedBytes(bits, channels, blockAlign, byteRate, sampleRateHz);
  if (!telephone && bytesPerSample > Math.ceil(bits / 8)) oddities.push('container-wide');
  const encoding = encodingOf(tag, bytesPerSample);
  const bytesPerFrame = bytesPerSample * channels;
  if (blockAlign !== bytesPerFrame) oddities.push('block-align-wrong');
  if (byteRate !== bytesPerFrame * sampleRateHz) oddities.push('byte-rate-wrong');
  const bitDepth = telephone ? 8 : valid;
  return { encoding, channels, sampleRateHz, bytesPerSample, bitDepth, bytesPerFrame, oddities };
}

/** The format tag, out of the sub-format where the chunk is extensible. */
function readTag(body: Uint8Array, view: DataView, little: boolean, bits: number) {
  const oddities: string[] = [];
  const tag = view.getUint16(0, little);
  if (tag !== EXTENSIBLE) return { tag, valid: bits, oddities };
  if (body.byteLength < FORMAT_BYTES) throw new Unreadable('format-short');
  if (GUID_TAIL.some((byte, i) => body[26 + i] !== byte)) throw new Unreadable('format-unknown');
  const valid = view.getUint16(18, little) || bits;
  if (valid > bits) oddities.push('valid-bits-wrong');
  return { tag: view.getUint16(24, little), valid: Math.min(valid, bits), oddities };
}

/**
 * Bytes a sample takes. 17 to 24 bits may stand in four bytes though the chunk is not extensible: believed where block
 * align and byte rate both say so (common practice, no source).
 */
function storedBytes(bits: number, channels: number, blockAlign: number, byteRate: number, rateHz: number) {
  const wide = bits > 16 && bits <= 24 && blockAlign === 4 * channels && byteRate === blockAlign * rateHz;
  return wide ? 4 : Math.ceil(bits / 8);
}

function encodingOf(tag: number, bytesPerSample: number): Encoding {
  const known = ((): Encoding | undefined => {
    if (tag === PCM) return (['pcm-u8', 'pcm-s16', 'pcm-s24', 'pcm-s32'] as const)[bytesPerSample - 1];
    if (tag === FLOAT) return bytesPerSample === 4 ? 'float32' : bytesPerSample === 8 ? 'float64' : undefined;
    if (tag === ALAW) return 'alaw';
    if (tag === MULAW) return 'mulaw';
    throw new Unreadable('format-unknown');
  })();
  if (!known) throw new Unreadable('bit-depth-unknown');
  return known;
}

/** `RIFF`, `RIFX`, `RF64` and `BW64` by their first four bytes. */
export const containerOf = (magic: string): Container =>
  magic === 'RF64' ? 'rf64' : magic === 'BW64' ? 'bw64' : 'wav';
