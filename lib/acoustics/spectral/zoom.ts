import { transform } from '../dsp/fft';
import { hann } from '../kernels/plan';
import type { Kernels } from '../kernels/types';

/** Rate of the series about the centre, Hz, at least. */
const SERIES_HZ = 40;
/** Windows that overlap this often: what aliases onto the centre falls into a null. */
const OVERLAP = 4;

/** Power about a centre frequency, at the resolution of the whole clip. */
export interface Zoom {
  /** Square of the amplitude of a steady line by offset, up to 10 Hz from the centre, which is index 0; negative offsets count from the end. */
  power: Float64Array;
  binHz: number;
}

/**
 * Spectrum of a clip about one frequency (zoom FFT): mixed down in overlapping Hann windows, whose own response is taken
 * out again, and a Hann window as long as the clip over the series that results.
 *
 * @param x in the kernels' arena, DC included
 */
export function zoomSpectrum(
  kernels: Kernels,
  x: Float32Array,
  rateHz: number,
  centreHz: number,
): Zoom | null {
  const hop = Math.max(1, Math.floor(rateHz / SERIES_HZ));
  const size = OVERLAP * hop;
  const count = Math.floor((x.length - size) / hop) + 1;
  if (count < 8) return null;
  const step = (2 * Math.PI * centreHz) / rateHz;
  const window = hann(size);
  const taps = () => kernels.arena.floats(Math.ceil(size / 4) * 4);
  const [cos, sin] = [taps(), taps()];
  for (let i = 0; i < size; i++) {
    cos[i] = (window[i] as number) * Math.cos(step * i);
    sin[i] = -(window[i] as number) * Math.sin(step * i);
  }
  const [a, b] = [kernels.arena.room(count), kernels.arena.room(count)];
  kernels.dots(cos, x, 0, hop, count, a);
  kernels.dots(sin, x, 0, hop, count, b);

  const length = 2 ** Math.ceil(Math.log2(count));
  const re = new Float64Array(length);
  const im = new Float64Array(length);
  const whole = hann(count);
  // Both windows pass a half of a steady line, and a line has its other half at the negative frequency.
  const gain = (0.5 * size * 0.5 * count) / 2;
  // The windows' own phases, taken back to the beginning of the clip.
  const turn = [Math.cos(step * hop), Math.sin(step * hop)] as const;
  let c = 1;
  let s = 0;
  for (let k = 0; k < count; k++) {
    const w = whole[k] as number;
    re[k] = w * (c * (a[k] as number) + s * (b[k] as number));
    im[k] = w * (c * (b[k] as number) - s * (a[k] as number));
    const turned = turn[0] * c - turn[1] * s;
    s = turn[1] * c + turn[0] * s;
    c = turned;
  }
  transform(re, im);
  const seriesHz = rateHz / hop;
  const binHz = seriesHz / length;
  const power = new Float64Array(length);
  const reach = Math.ceil(seriesHz / 4 / binHz);
  for (let n = -reach; n <= reach; n++) {
    const k = n < 0 ? n + length : n;
    const offsetHz = n * binHz;
    const own = hannResponse((offsetHz * size) / rateHz);
    power[k] = ((re[k] as number) ** 2 + (im[k] as number) ** 2) / (own * gain) ** 2;
  }
  return { power, binHz };
}

/** Amplitude response of a Hann window, 1 at 0 (Harris 1978). @param x offset in bins of the window */
function hannResponse(x: number): number {
  if (Math.abs(x) < 1e-9) return 1;
  const sinc = Math.sin(Math.PI * x) / (Math.PI * x);
  if (Math.abs(1 - x * x) < 1e-9) return 0.5;
  return Math.max(0.05, Math.abs(sinc / (1 - x * x)));
}
