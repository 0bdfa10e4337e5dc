import type { WaveformPeaks } from '@/lib/acoustics/types';
import type { Stretch } from './view';

export interface Surface {
  context: CanvasRenderingContext2D;
  /** Device pixels. */
  width: number;
  height: number;
}

/** Lowest and highest sample of each column of pixels, -1 to 1, interleaved: what was loudest is never lost. */
export function columnsOf(peaks: WaveformPeaks, view: Stretch, width: number): Float32Array {
  const columns = new Float32Array(width * 2);
  const framesPerPixel = ((view.to - view.from) * peaks.sampleRateHz) / width;
  let level = 0;
  while (level + 1 < peaks.levels.length && peaks.framesPerBucket * 2 ** (level + 1) <= framesPerPixel)
    level++;
  const data = peaks.levels[level];
  if (!data) return columns;
  const framesPerBucket = peaks.framesPerBucket * 2 ** level;
  const buckets = data.length / 2;
  const first = (view.from * peaks.sampleRateHz) / framesPerBucket;
  const perPixel = framesPerPixel / framesPerBucket;
  for (let x = 0; x < width; x++) {
    const start = Math.max(0, Math.floor(first + x * perPixel));
    const end = Math.min(buckets, Math.max(start + 1, Math.ceil(first + (x + 1) * perPixel)));
    let low = 127;
    let high = -127;
    for (let bucket = start; bucket < end; bucket++) {
      low = Math.min(low, data[bucket * 2] as number);
      high = Math.max(high, data[bucket * 2 + 1] as number);
    }
    if (high < low) continue;
    columns[x * 2] = low / 127;
    columns[x * 2 + 1] = high / 127;
  }
  return columns;
}

/**
 * The waveform of a stretch.
 *
 * @param gain what a sample is multiplied by before it is drawn: full height is full scale divided by it
 */
export function drawWaveform(
  surface: Surface,
  peaks: WaveformPeaks,
  view: Stretch,
  gain: number,
  colour: string,
): void {
  const { context, width, height } = surface;
  context.clearRect(0, 0, width, height);
  const columns = columnsOf(peaks, view, width);
  const middle = height / 2;
  context.fillStyle = colour;
  for (let x = 0; x < width; x++) {
    const high = Math.min(1, (columns[x * 2 + 1] as number) * gain);
    const low = Math.max(-1, (columns[x * 2] as number) * gain);
    const top = middle - high * middle;
    context.fillRect(x, top, 1, Math.max(1, (high - low) * middle));
  }
}
