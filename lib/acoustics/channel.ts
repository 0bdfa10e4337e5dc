import { BLOCK_FRAMES } from './decode/blocks';
import { Decimator } from './dsp/decimate';
import { Lookaround } from './dsp/lookaround';
import { ratesOf } from './dsp/rates';
import type { Kernels } from './kernels/types';
import { SpectrogramPicture } from './pictures/spectrogram';
import { BandProbe } from './spectral/bands';
import { BandwidthProbe } from './spectral/bandwidth';
import { SpectrumColumns } from './spectral/columns';
import { ExplosiveProbe } from './spectral/explosive';
import { TonalProbe } from './spectral/tonal';
import { DropoutProbe } from './time/dropouts';
import { HandlingProbe } from './time/handling';
import { dbfsSineToRms, LevelProbe, stepOf } from './time/levels';
import { RailProbe } from './time/rails';
import { REACH, SpikeProbe } from './time/spikes';
import { TruePeakProbe } from './time/truePeak';
import type { AudioFormat, Span } from './types';

/** All probes of one channel, each on the stream of the lowest rate that holds what it listens for. */
export class ChannelAnalysis {
  readonly #rateHz: number;
  readonly #levels: LevelProbe;
  readonly #rails: RailProbe;
  readonly #dropouts: DropoutProbe;
  readonly #around: Lookaround;
  readonly #spikes: SpikeProbe;
  readonly #truePeak: TruePeakProbe;
  readonly #bandwidth: BandwidthProbe;
  readonly #toEvents: Decimator;
  readonly #explosive: ExplosiveProbe;
  readonly #toLow: Decimator;
  readonly #handling: HandlingProbe;
  readonly #columns: SpectrumColumns;
  readonly #picture: SpectrogramPicture;
  readonly #tonal: TonalProbe;
  readonly #toDeep: Decimator;
  readonly #bands: BandProbe;

  /** @param kernels whose arena this channel has to itself; its blocks of at most BLOCK_FRAMES lie there too */
  constructor(format: AudioFormat, kernels: Kernels) {
    const rate = format.sampleRateHz;
    this.#rateHz = rate;
    const step = stepOf(format.encoding, format.bitDepth);
    const coarse = (format.bitDepth ?? 16) <= 8;
    const rails = new RailProbe(kernels.arena, format.encoding, format.bitDepth, rate);
    this.#rails = rails;
    this.#levels = new LevelProbe(kernels, rate, BLOCK_FRAMES, (samples, from, to, min, max) =>
      rails.look(samples, from, to, min, max),
    );
    this.#dropouts = new DropoutProbe(rate, step, coarse);
    this.#around = new Lookaround(kernels, REACH, BLOCK_FRAMES);
    this.#spikes = new SpikeProbe(kernels, this.#around, rate, step);
    this.#truePeak = new TruePeakProbe(kernels, this.#around);
    this.#bandwidth = new BandwidthProbe(kernels, rate, format.bitDepth);

    const rates = ratesOf(rate);
    const mostEvents = Math.ceil(BLOCK_FRAMES / rates.eventsFactor) + 2;
    const mostLow = Math.ceil(mostEvents / rates.lowFactor) + 2;
    const mostDeep = Math.ceil(mostLow / rates.deepFactor) + 2;
    // What lies between 2 and 4.4 kHz need not be clean: nobody listens there but for the beginning of a burst.
    this.#toEvents = new Decimator(kernels, rates.eventsFactor, BLOCK_FRAMES, 11);
    this.#explosive = new ExplosiveProbe(kernels, rates.eventsHz, mostEvents);
    this.#toLow = new Decimator(kernels, rates.lowFactor, mostEvents);
    this.#handling = new HandlingProbe(kernels, rates.deepHz, rates.eventsHz, {
      deep: mostDeep,
      events: mostEvents,
    });
    this.#columns = new SpectrumColumns(kernels, rates.lowHz, mostLow, (columns) => {
      this.#picture.push(columns);
      this.#tonal.push(columns);
      this.#bands.pushColumns(columns);
    });
    const { layout } = this.#columns;
    const mostColumns = Math.ceil(mostLow / layout.hop) + 4;
    this.#picture = new SpectrogramPicture(kernels, layout);
    this.#tonal = new TonalProbe(kernels, layout);
    this.#toDeep = new Decimator(kernels, rates.deepFactor, mostLow);
    this.#bands = new BandProbe(kernels, layout, rates.deepHz, { columns: mostColumns, deep: mostDeep });
  }

  push(samples: Float32Array): void {
    this.#levels.push(samples);
    this.#dropouts.push(samples);
    this.#around.push(samples);
    this.#spikes.look();
    this.#truePeak.look(Math.max(this.#levels.max, -this.#levels.min));
    this.#bandwidth.push(samples);
    const events = this.#toEvents.push(samples);
    this.#handling.pushHigh(this.#explosive.push(events));
    const low = this.#toLow.push(events);
    this.#columns.push(low);
    const deep = this.#toDeep.push(low);
    this.#handling.pushDeep(deep);
    this.#bands.pushDeep(deep);
  }

  finish(durationSeconds: number, minimumSecondsForRates: number) {
    const { min, max } = this.#levels;
    const levels = this.#levels.finish(this.#truePeak.finish({ min, max }));
    this.#columns.finish();
    const { activity, ...bands } = this.#bands.finish(durationSeconds, minimumSecondsForRates);
    // Harmonics that are too weak to be told of as hum still draw a line.
    const lines = bands.hum ? [1, 2, 3, 4, 5, 6].map((n) => n * (bands.hum?.frequencyHz ?? 0)) : [];
    const dropouts = this.#dropouts.finish(this.#levels.shortVariance.view(), { min, max });
    const holes = dropouts.map(({ startSeconds, lengthSamples }) => ({
      startSeconds,
      durationSeconds: lengthSamples / this.#rateHz,
    }));
    // The edge of a hole is a step, which neither clicked nor was touched; what crackles within a burst is its own.
    const rms = levels.rmsDbfsSine === null ? 0 : dbfsSineToRms(levels.rmsDbfsSine);
    const clicks = this.#spikes.finish(rms).filter((click) => !isNear(click, holes));
    const handling = this.#handling.finish(durationSeconds, holes, clicks);
    return {
      levels,
      rails: this.#rails.finish(),
      dropouts,
      spikes: clicks
        .filter((click) => !isNear(click, handling.handling))
        .map(({ startSeconds }) => ({ startSeconds })),
      activity: { ...activity, ...handling },
      spectrogram: this.#picture.finish(),
      spectral: {
        ...bands,
        ...this.#bandwidth.finish(),
        tonal: this.#tonal.finish(lines),
        explosive: this.#explosive.finish(),
      },
    };
  }
}

const EDGE_SECONDS = 0.003;

const isNear = (place: Span, spans: readonly Span[]): boolean =>
  spans.some(
    (span) =>
      place.startSeconds > span.startSeconds - EDGE_SECONDS &&
      place.startSeconds < span.startSeconds + span.durationSeconds + EDGE_SECONDS,
  );
