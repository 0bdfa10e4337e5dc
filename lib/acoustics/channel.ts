import { Decimator, decimationFor } from './dsp/decimate';
import { SpectrogramProbe } from './pictures/spectrogram';
import { BandProbe } from './spectral/bands';
import { BandwidthProbe } from './spectral/bandwidth';
import { ExplosiveProbe } from './spectral/explosive';
import { TonalProbe } from './spectral/tonal';
import { ActivityProbe } from './time/activity';
import { DropoutProbe } from './time/dropouts';
import { LevelProbe, stepOf } from './time/levels';
import { RailProbe } from './time/rails';
import { SpikeProbe } from './time/spikes';
import type { AudioFormat } from './types';

/** All probes of one channel. What lives below 2 kHz listens to the stream divided to about 5 kHz. */
export class ChannelAnalysis {
  readonly #levels: LevelProbe;
  readonly #rails: RailProbe;
  readonly #dropouts: DropoutProbe;
  readonly #spikes: SpikeProbe;
  readonly #decimator: Decimator;
  readonly #activity: ActivityProbe;
  readonly #spectrogram: SpectrogramProbe;
  readonly #tonal: TonalProbe;
  readonly #bands: BandProbe;
  readonly #bandwidth: BandwidthProbe;
  readonly #explosive: ExplosiveProbe;

  constructor(format: AudioFormat) {
    const rate = format.sampleRateHz;
    const step = stepOf(format.encoding, format.bitDepth);
    const coarse = (format.bitDepth ?? 16) <= 8;
    this.#levels = new LevelProbe(rate);
    this.#rails = new RailProbe(format.encoding, format.bitDepth);
    this.#dropouts = new DropoutProbe(rate, step, coarse);
    this.#spikes = new SpikeProbe(rate, step);
    this.#decimator = new Decimator(decimationFor(rate));
    const lowRate = rate / this.#decimator.factor;
    this.#activity = new ActivityProbe(lowRate);
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
    this.#rails.push(samples);
    this.#dropouts.push(samples);
    this.#spikes.push(samples);
    this.#bandwidth.push(samples);
    this.#explosive.push(samples);
    const low = this.#decimator.push(samples);
    this.#activity.push(low);
    this.#spectrogram.push(low);
    this.#bands.push(low);
  }

  finish(durationSeconds: number, minimumSecondsForRates: number) {
    const { min, max } = this.#levels;
    const bands = this.#bands.finish(minimumSecondsForRates);
    // Harmonics that are too weak to be told of as hum still draw a line.
    const lines = bands.hum ? [1, 2, 3, 4, 5, 6].map((n) => n * (bands.hum?.frequencyHz ?? 0)) : [];
    return {
      levels: this.#levels.finish(),
      rails: this.#rails.finish(),
      dropouts: this.#dropouts.finish(this.#levels.shortVariance.view(), { min, max }),
      spikes: this.#spikes.finish(),
      activity: this.#activity.finish(durationSeconds),
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
