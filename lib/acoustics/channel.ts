import { Decimator, decimationFor } from './dsp/decimate';
import { SpectrogramProbe } from './pictures/spectrogram';
import { NOTHING_SPECTRAL } from './spectral/nothing';
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
    this.#spectrogram = new SpectrogramProbe(lowRate);
  }

  push(samples: Float32Array): void {
    this.#levels.push(samples);
    this.#rails.push(samples);
    this.#dropouts.push(samples);
    this.#spikes.push(samples);
    const low = this.#decimator.push(samples);
    this.#activity.push(low);
    this.#spectrogram.push(low);
  }

  finish(durationSeconds: number) {
    const { min, max } = this.#levels;
    return {
      levels: this.#levels.finish(),
      rails: this.#rails.finish(),
      dropouts: this.#dropouts.finish(this.#levels.shortVariance.view(), { min, max }),
      spikes: this.#spikes.finish(),
      activity: this.#activity.finish(durationSeconds),
      spectrogram: this.#spectrogram.finish(),
      spectral: NOTHING_SPECTRAL,
    };
  }
}
