import { COLOUR_MAP } from '@/lib/acoustics/pictures/colourMap';
import type { Spectrogram } from '@/lib/acoustics/types';
import type { DbScale } from './drawSpectrogram';

const byteAt = (index: number, channel: number) => COLOUR_MAP[index * 3 + channel] ?? 0;

/** The colours as a CSS gradient, quiet to loud. */
export const SPECTROGRAM_GRADIENT = `linear-gradient(90deg, ${Array.from({ length: 13 }, (_, step) => {
  const index = Math.round((step / 12) * 255);
  return `rgb(${byteAt(index, 0)} ${byteAt(index, 1)} ${byteAt(index, 2)})`;
}).join(', ')})`;

/** Colours as 0xAABBGGRR for every byte of a spectrogram on a scale. */
export function paletteOf(spectrogram: Spectrogram, scale: DbScale): Uint32Array {
  return Uint32Array.from({ length: 256 }, (_, byte) => {
    const db = spectrogram.floorDb + byte * spectrogram.stepDb;
    const share = Math.min(1, Math.max(0, (db - scale.lowDb) / (scale.highDb - scale.lowDb || 1)));
    const index = Math.round(share * 255);
    return ((255 << 24) | (byteAt(index, 2) << 16) | (byteAt(index, 1) << 8) | byteAt(index, 0)) >>> 0;
  });
}
