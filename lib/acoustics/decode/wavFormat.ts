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

/**
 * @param body the fmt chunk's bytes
 * @throws Unreadable `format-short`, `format-unknown`, `bit-depth-unknown`, `rate-out-of-range`, `channels-out-of-range`
 */
export function readWavFormat(body: Uint8Array, bigEndian: boolean): WavFormat {
  if (body.byteLength < 14) throw new Unreadable('format-short');
  const view = new DataView(body.buffer, body.byteOffset, body.byteLength);
  const little = !bigEndian;
  let tag = view.getUint16(0, little);
  const channels = view.getUint16(2, little);
  const sampleRateHz = view.getUint32(4, little);
  const byteRate = view.getUint32(8, little);
  const blockAlign = view.getUint16(12, little);
  const container = body.byteLength >= 16 ? view.getUint16(14, little) : 8;
  let valid = container;
  const oddities: string[] = [];
  if (tag === EXTENSIBLE) {
    if (body.byteLength < 40) throw new Unreadable('format-short');
    valid = view.getUint16(18, little) || container;
    tag = view.getUint16(24, little);
    if (GUID_TAIL.some((byte, i) => body[26 + i] !== byte)) throw new Unreadable('format-unknown');
    if (valid > container) {
      oddities.push('valid-bits-wrong');
      valid = container;
    }
  }
  checkFormat(sampleRateHz, channels);
  const bytesPerSample = Math.ceil(container / 8);
  const encoding = encodingOf(tag, bytesPerSample);
  const bytesPerFrame = bytesPerSample * channels;
  if (blockAlign !== bytesPerFrame) oddities.push('block-align-wrong');
  if (byteRate !== bytesPerFrame * sampleRateHz) oddities.push('byte-rate-wrong');
  return { encoding, channels, sampleRateHz, bytesPerSample, bitDepth: valid, bytesPerFrame, oddities };
}

function encodingOf(tag: number, bytesPerSample: number): Encoding {
  const known = ((): Encoding | undefined => {
    if (tag === PCM) return (['pcm-u8', 'pcm-s16', 'pcm-s24', 'pcm-s32'] as const)[bytesPerSample - 1];
    if (tag === FLOAT) return bytesPerSample === 4 ? 'float32' : bytesPerSample === 8 ? 'float64' : undefined;
    if (tag === ALAW) return bytesPerSample === 1 ? 'alaw' : undefined;
    if (tag === MULAW) return bytesPerSample === 1 ? 'mulaw' : undefined;
    throw new Unreadable('format-unknown');
  })();
  if (!known) throw new Unreadable('bit-depth-unknown');
  return known;
}

/** `RIFF`, `RIFX`, `RF64` and `BW64` by their first four bytes. */
export const containerOf = (magic: string): Container =>
  magic === 'RF64' ? 'rf64' : magic === 'BW64' ? 'bw64' : 'wav';
