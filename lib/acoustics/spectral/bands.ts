import { type Biquad, passFilter } from '../dsp/biquad';
import { Decimator } from '../dsp/decimate';
import { FloatList } from '../dsp/percentile';
import type { Hum, Rate } from '../types';
import { findHum } from './hum';
import { rateOf } from './rates';

/** Rate at which hum and heart are looked at. */
const LOW_RATE_HZ = 640;
/** Hum is steady by definition and a heart rate is of the moment: no more than this is kept of a long clip. */
const KEPT_SECONDS = 300;
const BREATH_ENVELOPE_HZ = 50;
const HEART_ENVELOPE_HZ = 100;
/** Autocorrelation grows with the square of what it is given. */
const LONGEST_ENVELOPE_SECONDS = 300;

export interface BandMeasures {
  hum: Hum | null;
  breathRate: Rate | null;
  /** Breaths that the clip holds, from the rate and its length. */
  breaths: number | null;
  heartRate: Rate | null;
}

/** Mean of the rectified signal a block: an envelope at a low rate. */
class Rectifier {
  readonly values = new FloatList();
  #sum = 0;
  #n = 0;
  #due: number;
  constructor(private readonly samplesPerValue: number) {
    this.#due = samplesPerValue;
  }

  push(samples: Float32Array, length: number): void {
    for (let i = 0; i < length; i++) {
      this.#sum += Math.abs(samples[i] as number);
      // A fractional block length keeps the envelope's rate exact.
      if (++this.#n < this.#due) continue;
      this.values.push(this.#sum / this.#n);
      this.#due += this.samplesPerValue - this.#n;
      this.#sum = 0;
      this.#n = 0;
    }
  }
}

/** One-pole low-pass of an envelope, forwards and backwards so that nothing shifts in time. */
function smooth(values: Float32Array, cutoffHz: number, rateHz: number): Float32Array {
  const out = Float32Array.from(values);
  const a = Math.exp((-2 * Math.PI * cutoffHz) / rateHz);
  let low = out[0] ?? 0;
  for (let i = 0; i < out.length; i++) out[i] = low = (1 - a) * (out[i] as number) + a * low;
  for (let i = out.length - 1; i >= 0; i--) out[i] = low = (1 - a) * (out[i] as number) + a * low;
  return out;
}

/**
 * Hum, breath rate and heart rate of one channel, on the stream divided to about 5 kHz. Breath: 150-700 Hz, above most
 * of the heart; heart: 25-150 Hz. Only envelopes and five minutes of the low band are kept.
 */
export class BandProbe {
  readonly #low: Decimator;
  readonly #lowRateHz: number;
  readonly #kept = new FloatList();
  readonly #breathBand: Biquad[];
  readonly #heartBand: Biquad[];
  readonly #wideBand: Biquad[];
  readonly #breath: Rectifier;
  readonly #heart: Rectifier;
  #squares = 0;
  #frames = 0;
  #buffer = new Float32Array(0);

  constructor(private readonly rateHz: number) {
    this.#low = new Decimator(Math.max(1, Math.floor(rateHz / LOW_RATE_HZ)));
    this.#lowRateHz = rateHz / this.#low.factor;
    const band = (from: number, to: number, rate: number): Biquad[] => [
      passFilter('high', from, rate),
      passFilter('high', from, rate),
      passFilter('low', to, rate),
    ];
    this.#breathBand = band(150, 700, rateHz);
    this.#wideBand = band(100, 600, rateHz);
    this.#heartBand = band(25, 150, this.#lowRateHz);
    this.#breath = new Rectifier(rateHz / BREATH_ENVELOPE_HZ);
    this.#heart = new Rectifier(this.#lowRateHz / HEART_ENVELOPE_HZ);
  }

  push(samples: Float32Array): void {
    if (this.#buffer.length < samples.length) this.#buffer = new Float32Array(samples.length);
    this.#run(this.#breathBand, samples);
    this.#breath.push(this.#buffer, samples.length);
    this.#run(this.#wideBand, samples);
    for (let i = 0; i < samples.length; i++) this.#squares += (this.#buffer[i] as number) ** 2;
    this.#frames += samples.length;
    const low = this.#low.push(samples);
    if (this.#kept.length < KEPT_SECONDS * this.#lowRateHz) for (const x of low) this.#kept.push(x);
    this.#run(this.#heartBand, low);
    this.#heart.push(this.#buffer, low.length);
  }

  #run(filters: Biquad[], samples: Float32Array): void {
    let input = samples;
    for (const filter of filters) {
      filter.run(input, this.#buffer, samples.length);
      input = this.#buffer;
    }
  }

  finish(minimumSecondsForRates: number): BandMeasures {
    const seconds = this.#frames / this.rateHz;
    const bandRms = this.#frames > 0 ? Math.sqrt(this.#squares / this.#frames) : 0;
    const hum = findHum(this.#kept.view(), this.#lowRateHz, bandRms);
    if (seconds < minimumSecondsForRates) return { hum, breathRate: null, breaths: null, heartRate: null };
    const longest = (rate: number, values: Float32Array) =>
      values.subarray(0, LONGEST_ENVELOPE_SECONDS * rate);
    const breath = smooth(longest(BREATH_ENVELOPE_HZ, this.#breath.values.view()), 1, BREATH_ENVELOPE_HZ);
    const heart = smooth(longest(HEART_ENVELOPE_HZ, this.#heart.values.view()), 8, HEART_ENVELOPE_HZ);
    const breathRate = rateOf(breath, BREATH_ENVELOPE_HZ, { slowest: 5, fastest: 60 });
    return {
      hum,
      breathRate,
      breaths: breathRate ? Math.round((breathRate.perMinute * seconds) / 60) : null,
      heartRate: rateOf(heart, HEART_ENVELOPE_HZ, { slowest: 40, fastest: 200 }),
    };
  }
}
