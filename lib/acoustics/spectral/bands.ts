import { FilterChain, highPass, lowPass } from '../dsp/biquad';
import { Framer } from '../dsp/framer';
import { FloatList } from '../dsp/percentile';
import type { Kernels } from '../kernels/types';
import {
  ACTIVITY_BAND_HZ,
  ACTIVITY_BLOCK_SECONDS,
  type ActivityMeasures,
  activityOf,
} from '../time/activity';
import type { Hum, Rate } from '../types';
import { BandLevels, Means } from './bandLevels';
import type { ColumnLayout, Columns } from './columns';
import { findHum } from './hum';
import { rateOf } from './rates';

/** Hum is steady by definition and a rate is of the moment: no more than this is kept of a long clip. */
const KEPT_SECONDS = 300;
const BREATH_BAND_HZ = { low: 150, high: 700 };
const BREATH_ENVELOPE_HZ = 25;
/** What hum is held against. */
const NOTE_BAND_HZ = { low: 100, high: 600 };
const HEART_BAND_HZ = { low: 25, high: 150 };
const HEART_ENVELOPE_HZ = 100;

export interface BandMeasures {
  activity: ActivityMeasures;
  hum: Hum | null;
  breathRate: Rate | null;
  /** Breaths that the clip holds, from the rate and its length. */
  breaths: number | null;
  heartRate: Rate | null;
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

/** Mean of the rectified deep stream at the heart's envelope rate. */
class HeartEnvelope {
  readonly values = new FloatList();
  readonly #filter: FilterChain;
  readonly #filtered: Float32Array;
  readonly #framer: Framer;
  #sum = 0;
  readonly rateHz: number;

  constructor(kernels: Kernels, deepHz: number, mostSamples: number) {
    const { low, high } = HEART_BAND_HZ;
    this.#filter = new FilterChain(kernels, [
      highPass(low, deepHz),
      highPass(low, deepHz),
      lowPass(high, deepHz),
    ]);
    this.#filtered = kernels.arena.floats(mostSamples);
    const block = Math.max(1, Math.round(deepHz / HEART_ENVELOPE_HZ));
    this.#framer = new Framer(block);
    this.rateHz = deepHz / block;
  }

  push(deep: Float32Array): void {
    const out = this.#filtered.subarray(0, deep.length);
    this.#filter.run(deep, out);
    const { length } = this.#framer;
    const add = (x: Float32Array, from: number, to: number) => {
      for (let i = from; i < to; i++) this.#sum += Math.abs(x[i] as number);
    };
    const close = () => {
      this.values.push(this.#sum / length);
      this.#sum = 0;
    };
    this.#framer.push(
      out,
      (part, ends) => {
        add(part, 0, part.length);
        if (ends) close();
      },
      (frames, count) => {
        for (let k = 0; k < count; k++) {
          add(frames, k * length, (k + 1) * length);
          close();
        }
      },
    );
  }
}

/**
 * What the levels of bands tell: activity, hum, breath rate (150-700 Hz, above most of the heart) and heart rate (25-150
 * Hz). Bands above 100 Hz come from the columns of the spectrum; hum and heart from the stream divided to about 640 Hz.
 */
export class BandProbe {
  readonly #levels: BandLevels;
  readonly #bands: Record<'activity' | 'breath' | 'note', ReturnType<BandLevels['band']>>;
  readonly #activity: Means;
  readonly #breath: Means;
  readonly #heart: HeartEnvelope;
  readonly #deep = new FloatList();
  #noteSum = 0;
  #columns = 0;

  /** @param most columns, and deep samples, that a push will bring */
  constructor(
    private readonly kernels: Kernels,
    private readonly layout: ColumnLayout,
    private readonly deepHz: number,
    most: { columns: number; deep: number },
  ) {
    this.#levels = new BandLevels(kernels, layout);
    const band = ({ low, high }: { low: number; high: number }) => this.#levels.band(low, high, most.columns);
    this.#bands = {
      activity: band(ACTIVITY_BAND_HZ),
      breath: band(BREATH_BAND_HZ),
      note: band(NOTE_BAND_HZ),
    };
    this.#activity = new Means(layout, ACTIVITY_BLOCK_SECONDS);
    this.#breath = new Means(layout, 1 / BREATH_ENVELOPE_HZ);
    this.#heart = new HeartEnvelope(kernels, deepHz, most.deep);
  }

  pushColumns({ power, columns }: Columns): void {
    this.#activity.push(this.#levels.of(this.#bands.activity, power, columns));
    const note = this.#levels.of(this.#bands.note, power, columns);
    for (let i = 0; i < columns; i++) this.#noteSum += note[i] as number;
    if (this.#columns * this.layout.columnSeconds < KEPT_SECONDS)
      this.#breath.push(this.#levels.of(this.#bands.breath, power, columns));
    this.#columns += columns;
  }

  /** @param deep the stream at `deepHz`, in the kernels' arena */
  pushDeep(deep: Float32Array): void {
    if (this.#deep.length >= KEPT_SECONDS * this.deepHz) return;
    this.#deep.append(deep);
    this.#heart.push(deep);
  }

  finish(seconds: number, minimumSecondsForRates: number): BandMeasures {
    const noteRms = this.#columns > 0 ? Math.sqrt(this.#noteSum / this.#columns) : 0;
    const deep = this.kernels.arena.floats(this.#deep.length);
    deep.set(this.#deep.view());
    const still = {
      activity: activityOf(this.#activity.values.view()),
      hum: findHum(this.kernels, deep, this.deepHz, noteRms),
    };
    if (seconds < minimumSecondsForRates)
      return { ...still, breathRate: null, breaths: null, heartRate: null };
    const breath = smooth(this.#breath.values.view().map(Math.sqrt), 1, BREATH_ENVELOPE_HZ);
    const heart = smooth(this.#heart.values.view(), 8, this.#heart.rateHz);
    const breathRate = rateOf(this.kernels, breath, BREATH_ENVELOPE_HZ, { slowest: 5, fastest: 60 });
    return {
      ...still,
      breathRate,
      breaths: breathRate ? Math.round((breathRate.perMinute * seconds) / 60) : null,
      heartRate: rateOf(this.kernels, heart, this.#heart.rateHz, { slowest: 40, fastest: 200 }),
    };
  }
}
