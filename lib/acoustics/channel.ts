import { Decimator, decimationFor } from './dsp/decimate';
import { SpectrogramProbe } from './pictures/spectrogram';
import { BandProbe } from './spectral/bands';
import { BandwidthProbe } from './spectral/bandwidth';
import { ExplosiveProbe } from './spectral/explosive';
import { TonalProbe } from './spectral/tonal';
import { ActivityProbe } from './time/activity';
import { DropoutProbe } from './time/dropouts';
import { HandlingProbe } from './time/handling';
import { dbfsSineToRms, LevelProbe, stepOf } from './time/levels';
import { RailProbe } from './time/rails';
import { SpikeProbe } from './time/spikes';
import type { AudioFormat, Span } from './types';

/** All probes of one channel. What lives below 2 kHz listens to the stream divided to about 5 kHz. */
export class ChannelAnalysis {
  readonly #rateHz: number;
  readonly #levels: LevelProbe;
  readonly #rails: RailProbe;
  readonly #dropouts: DropoutProbe;
  readonly #spikes: SpikeProbe;
  readonly #decimator: Decimator;
  readonly #activity: ActivityProbe;
  readonly #handling: HandlingProbe;
  readonly #spectrogram: SpectrogramProbe;
  readonly #tonal: TonalProbe;
  readonly #bands: BandProbe;
  readonly #bandwidth: BandwidthProbe;
  readonly #explosive: ExplosiveProbe;

  constructor(format: AudioFormat) {
    const rate = format.sampleRateHz;
    this.#rateHz = rate;
    const step = stepOf(format.encoding, format.bitDepth);
    const coarse = (format.bitDepth ?? 16) <= 8;
    const rails = new RailProbe(format.encoding, format.bitDepth, rate);
    this.#rails = rails;
    this.#levels = new LevelProbe(rate, (samples, from, to, min, max) =>
      rails.look(samples, from, to, min, max),
    );
    this.#dropouts = new DropoutProbe(rate, step, coarse);
    this.#spikes = new SpikeProbe(rate, step);
    this.#decimator = new Decimator(decimationFor(rate));
    const lowRate = rate / this.#decimator.factor;
    this.#activity = new ActivityProbe(lowRate);
    this.#handling = new HandlingProbe(lowRate);
    this.#spectrogram = new SpectrogramProbe(lowRate, (power, scale) => this.#tonal.push(power, scale));
    const { binHz, bins, columnSeconds, windowSeconds } = this.#spectrogram.layout;
    this.#tonal = new TonalProbe(binHz, bins, columnSeconds, windowSeconds);
    this.#bands = new BandProbe(lowRate);
    this.#bandwidth = new BandwidthProbe(rate, format.bitDepth);
    // Widths of a millisecond want the file's own rate, up to where it no longer matters.
    this.#explosive = new ExplosiveProbe(rate);
  }

  push(samples: Float32Array): void {
    this.#levels.push(samples);
    this.#dropouts.push(samples);
    this.#spikes.push(samples);
    this.#bandwidth.push(samples);
    this.#explosive.push(samples);
    const low = this.#decimator.push(samples);
    this.#activity.push(low);
    this.#handling.push(low);
    this.#spectrogram.push(low);
    this.#bands.push(low);
  }

  finish(durationSeconds: number, minimumSecondsForRates: number) {
    const { min, max } = this.#levels;
    const levels = this.#levels.finish();
    const bands = this.#bands.finish(minimumSecondsForRates);
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
      activity: { ...this.#activity.finish(), ...handling },
      spectrogram: this.#spectrogram.finish(),
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
