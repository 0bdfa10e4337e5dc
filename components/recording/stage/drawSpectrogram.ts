import type { Spectrogram } from '@/lib/acoustics/types';
import type { Surface } from './drawWaveform';
import type { Stretch } from './view';

/** The levels between which the colours run, dB re a full-scale sine. */
export interface DbScale {
  lowDb: number;
  highDb: number;
}

const SHOWN_RANGE_DB = 70;

/** From the loudest byte of a clip 70 dB down: what is quieter than that is drawn in the darkest colour. */
export function scaleOf(spectrogram: Spectrogram): DbScale {
  let most = 0;
  for (const byte of spectrogram.data) if (byte > most) most = byte;
  const highDb = spectrogram.floorDb + most * spectrogram.stepDb;
  return { lowDb: Math.max(spectrogram.floorDb, highDb - SHOWN_RANGE_DB), highDb };
}

/** Draws from 0 Hz at the bottom to `topHz`; of several columns under one pixel the loudest is shown. */
export function drawSpectrogram(
  surface: Surface,
  spectrogram: Spectrogram,
  view: Stretch,
  topHz: number,
  palette: Uint32Array,
): void {
  const { context, width, height } = surface;
  const image = context.createImageData(width, height);
  const pixels = new Uint32Array(image.data.buffer);
  const column = new Float32Array(spectrogram.bins);
  const secondsPerPixel = (view.to - view.from) / width;
  const binPerPixel = topHz / spectrogram.binHz / height;
  for (let x = 0; x < width; x++) {
    const from = view.from + x * secondsPerPixel;
    loudestColumn(spectrogram, from, from + secondsPerPixel, column);
    for (let y = 0; y < height; y++) {
      const bin = (height - 1 - y + 0.5) * binPerPixel;
      const below = Math.floor(bin);
      if (below >= spectrogram.bins) continue;
      const low = column[below] as number;
      const high = below + 1 < spectrogram.bins ? (column[below + 1] as number) : low;
      pixels[y * width + x] = palette[Math.round(low + (high - low) * (bin - below))] as number;
    }
  }
  context.putImageData(image, 0, 0);
}

function loudestColumn(spectrogram: Spectrogram, from: number, to: number, out: Float32Array): void {
  const { bins, columns, firstColumnSeconds, columnSeconds, data } = spectrogram;
  const at = (seconds: number) => (seconds - firstColumnSeconds) / columnSeconds;
  const first = Math.min(columns - 1, Math.max(0, Math.round(at(from))));
  const last = Math.min(columns - 1, Math.max(first, Math.round(at(to)) - 1));
  if (last === first) {
    // Between two columns the picture is blended, so that a close look is not a row of blocks.
    const place = Math.min(columns - 1, Math.max(0, at((from + to) / 2)));
    const left = Math.floor(place);
    const right = Math.min(columns - 1, left + 1);
    const share = place - left;
    for (let bin = 0; bin < bins; bin++)
      out[bin] =
        (data[left * bins + bin] as number) * (1 - share) + (data[right * bins + bin] as number) * share;
    return;
  }
  for (let bin = 0; bin < bins; bin++) {
    let most = 0;
    for (let column = first; column <= last; column++)
      most = Math.max(most, data[column * bins + bin] as number);
    out[bin] = most;
  }
}
